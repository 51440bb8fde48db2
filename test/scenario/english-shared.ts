import type { Lexicon } from './grammar.ts';
import type { SharedLanguage } from './topic.ts';

// biome-ignore format: prose in tables
export const englishShared: SharedLanguage = {
  subjects: ['Question', 'Enquiry', '(Hello|Help please)', 'Account {account}', 'Re: your letter', '(Quick|) question', 'Please (help|read)', '{address}', 'Follow up', ''],
  greetings: ['Dear Sir or Madam,', 'Hello,', 'Hi,', 'Hi there,', 'Good (morning|afternoon),', 'Dear Fenmark Water,', 'Dear team,', 'To whom it may concern,', ''],
  openers: [
    'I (phoned|rang|called) {when} and was told to write.', 'My account number is {account}.', 'I am writing (about|for) {address}.', 'Following my e-mail (of|from) {since}:',
    'I hope you can help (me|us).', 'I am (writing|asking) for my (mother|neighbour|father), who has no e-mail.', 'Thank you for your (letter|card|bill) (of|from) {since}.', 'Sorry to trouble you again.',
    'We live at {address}.', 'I could not find this on your website.', 'I filled in the form {when} but it did not go through.',
  ],
  context: [
    'We have lived here for {years}.', 'I pay by direct debit.', 'There is a meter in the (drive|pavement).', 'We have two small children.', 'The house is (a terrace|on a hill|at the end of the road).',
    'I am away until {weekday}.', 'My account is {account}.', 'There are road works in {road} at the moment.', 'I do not have a computer at home.', 'I sent a photograph {when}.',
    'The previous bill was all right.', 'I am disabled and on your priority register.', 'I work nights, so please call in the afternoon.', 'My (landlord|letting agent) says that it is your job.',
    'My neighbour at number {house} knows more.', 'The last time it was (sorted|repaired) within a day.', 'I was told that it would take {duration}.', 'I have spoken to {surname} in your office.',
    'The tap in the kitchen works.', 'Your van was here {when}.', 'I have the letter in front of me.', 'The water (is|seems) fine otherwise.', 'The drain was cleaned {when}.', 'We move in the summer, by the way.',
    'The meter was read {when}.', 'I have already given you a reading.', 'A leak was repaired in {road} {when}.', 'I do not want to complain, (but|only) this is odd.', 'The reference is {job}.', 'It costs us money every day.',
  ],
  chatter: [
    'What weather we are having.', 'I hope you had a good (weekend|Christmas|Easter).', 'My late husband always dealt with these things.', 'The young man at the desk in {place} was very kind.',
    'We are just back from holiday.', 'I am eighty-{small} and not good with computers.', 'Sorry for the typing, I am on the train.', 'The dog does not like your vans, ha ha.',
    'I know you are busy.', 'Your hold music is dreadful.', 'I saw you at the {place} fair.', 'Our river looks lovely this year.', 'Please excuse the long mail.',
  ],
  asks: [
    'Please let me know.', 'Could someone call me on {phone}?', 'Can you tell me what (happens|to do) next?', 'Please confirm that you have received this.', 'When can I expect an answer?', 'Please look into it.',
    'Can you send someone?', 'I look forward to your reply.', 'What do I (need|have) to do?', 'Please put this right.', 'Can you check (this|it) for me?', 'How long will it take?',
  ],
  asides: ['By the way, ', 'One more thing: ', 'Separately, ', 'While I am writing: ', 'PS: ', 'And another thing. ', 'Also, '],
  closings: ['Thank you', 'Many thanks', 'Regards', 'Kind regards', 'Yours faithfully', 'Yours sincerely', 'Thanks', 'Best wishes', 'Cheers'],
  short: [
    'Any news (on this|) please? {account}', 'Please call me on {phone}.', 'See attached.', 'As discussed on the phone.', 'Did you get my (last|) e-mail?', 'Yes, {weekday} is fine.', 'Thank you, that has (worked|helped).',
    'Here is the photo you asked for.', 'Still the same here at {address}.', 'Who do I speak to about {address}?', 'Please answer my question of {since}.', 'It is {reading}, as you asked.', 'No, nobody has been (here|in touch) yet.', 'I have paid now.',
    'What is the number of the person in charge?', 'This is not what I asked. Please read my mail again.', 'OK, will do.', 'The form is attached.', 'It happened again {when}.', 'Please cancel my (request|appointment).',
  ],
  forwards: ['Please see below.', 'Forwarded for you to deal with.', 'This came to us by mistake.', 'Can you answer my tenant please?', 'FYI, see the message underneath.'],
  attribution: 'On {date}, {who} wrote:',
  forwardRule: '-------- Forwarded message --------',
  sentFrom: ['Sent from my phone', 'Sent from my tablet, please excuse brevity'],
};

const colours = ['brown', 'cloudy', 'yellow', 'milky', 'rusty', 'grey', 'tea-coloured', 'orange'];

// biome-ignore format: prose in tables
export const englishLexicon: Lexicon = {
  when: ['yesterday', 'last week', 'last {weekday}', 'on {weekday}', '{small} days ago', 'this morning', 'on the {day}', 'two weeks ago', 'in {month}', 'the other day', 'last night', 'at the weekend'],
  since: ['yesterday', 'last week', '{weekday}', 'this morning', 'last {weekday}', 'the weekend', 'the {day} of {month}'],
  'when-next': ['next week', 'on {weekday}', 'tomorrow', 'next {weekday}', 'in {small} weeks'],
  weekday: ['Monday', 'Tuesday', 'Wednesday', 'Thursday', 'Friday', 'Saturday'],
  month: ['January', 'February', 'March', 'April', 'May', 'December', 'November'],
  cycle: ['this quarter', 'the half year', 'January to March', 'the winter', 'the last period', 'the year'],
  duration: ['{small} weeks', 'a month', '{small} days', 'over a week', 'months', 'nearly a year', 'ages'],
  times: ['twice', 'double', 'three times', 'four times'],
  'times-word': ['second', 'third', 'fourth', 'fifth'],
  household: ['the house', 'our household', 'this flat', 'the family'],
  address: ['{street}', '{house} {road}', '{street}, {town}', '{house} {road}, {place}', 'flat {small}, {house} {road}', '{street}, {postcode}'],
  'postcode-area': ['{postcode}', 'FW{small}', '{place}'],
  neighbour: ['next door', 'the neighbour', 'number {house}', 'our neighbour {surname}'],
  surname: ['Mrs Ashdrake', 'Mr Hobday', 'Ms Marrack', 'Mr Mossop', 'Mrs Inglesham', 'Dr Larkspur', 'Mr Chaudry'],
  'has-been': ['has been', 'has now been'],
  hour: ['7 am', 'half past eight', '9.15', 'noon', '4 pm', '6 in the morning'],
  colour: colours,
  taste: ['chlorine', 'metal', 'earth', 'bleach', 'bad eggs', 'diesel', 'plastic'],
  bits: ['black bits', 'white flakes', 'small brown specks', 'a kind of sand', 'tiny worms (I think)'],
  outside: ['garden', 'drive', 'back yard', 'road', 'alley'],
  size: ['25', '32', '63'],
  'hold-time': ['forty minutes', 'an hour', '25 minutes', 'half an hour'],
  years: ['{small} years', 'twenty years', 'over thirty years', 'a year'],
  post: ['network technician', 'meter reader', 'customer adviser', 'treatment works operator', 'process engineer', 'drainage surveyor', 'billing clerk', 'laboratory analyst', 'leakage inspector'],
  goods: ['leak loggers', 'pipe fittings', 'meter boxes', 'drain cameras', 'pumps', 'water filters', 'road barriers', 'billing software', 'cleaning services', 'work boots'],
};
