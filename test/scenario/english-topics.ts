import type { Topic } from './topic.ts';

/** Letters in English, by topic. All invented. */
// biome-ignore format: prose in tables
export const englishTopics: readonly Topic[] = [
  {
    id: 'bill-too-high', queues: { billing: 1 }, weight: 9,
    subjects: ['Bill (too high|query|looks wrong)', '{account} {cycle} bill', 'My water bill', 'Question about the (last|latest) bill', 'How can it be £{amount}?'],
    core: [
      'The (bill|statement) that (arrived|came) {when} is for £{amount}, (nearly|more than) {times} what I (usually|normally) pay.',
      'I do not understand how you (get|arrive) at £{amount} for {cycle}.',
      'You have charged (me|us) £{amount} and I (think|believe) it should be (less|about half of that).',
      'There is a (line|charge) of £{amount} on my (bill|account) that nobody can explain to me.',
      'My charges for {cycle} (have gone|went) up by £{amount} with no (change|difference) in {household}.',
    ],
    more: [
      'Nothing has changed in {household}.', 'We are (two people|a small household) and (out|at work) all day.', 'The meter reading on it (looks|seems) about right.',
      'Is the drainage part included twice?', 'I have checked for leaks and found none.', 'The standing charge alone (is|seems) {pounds} pounds.',
      'I would like (an itemised|a corrected) bill.', 'Last year (the same|that) quarter was £{amount}.', 'Have you used an estimate instead of (my|the) reading?',
    ],
  },
  {
    id: 'direct-debit', queues: { billing: 1 }, weight: 7,
    subjects: ['Direct debit', 'Payment (date|plan)', 'Change of (bank|payment date)', 'Instalments', '{account} payment'],
    core: [
      'I want to (change|move) (the date of|) my direct debit to the {day} of the month.',
      'You took £{amount} from my (bank|account) {when}, and then (again|the same amount) two days later.',
      'Please (set up|start) a direct debit for account {account}.',
      'My new bank says that (your|the) direct debit was (refused|returned) {when}.',
      'Can I (pay|spread) the £{amount} (in|over) {small} instalments?',
    ],
    more: [
      'My bank details have changed.', 'I (was|have been) charged a fee by my bank.', 'I get paid at the end of the month.', 'Things are (tight|difficult) since I lost hours at work.',
      'The online page (says|keeps saying) that my card is not accepted.', 'I (paid|have paid) by card over the phone {when}.', 'The monthly amount should (go down|be lower) I think.',
    ],
  },
  {
    id: 'refund-credit', queues: { billing: 1 }, weight: 4,
    subjects: ['Refund', 'Credit on account {account}', 'Money owed to (me|us)', 'Final balance'],
    core: [
      'My account is £{amount} in credit and I (would like|want) it (back|refunded).',
      'I (was|have been) promised a refund of £{amount} {when} and nothing has (come|arrived).',
      'I paid the (bill|same bill) twice by mistake, £{amount} each time.',
      'The final bill for (my|our) old (house|flat) shows a credit of £{amount}.',
    ],
    more: ['Please send it to the account that the direct debit comes from.', 'A cheque is fine.', 'We moved out of {road} {when}.', 'The person on the phone could see it (too|as well).', 'It has been {duration} now.'],
  },
  {
    id: 'tariff-help', queues: { billing: 1 }, weight: 3,
    subjects: ['Social tariff', 'Help with (paying|my bill)', 'Reduced rate?', 'Surface water charge'],
    core: [
      'I am on a pension and (would like|want) to know whether I can get the reduced (rate|tariff).',
      'My rain water goes into a soakaway, so I should not (pay|be charged) for surface water drainage.',
      'Somebody told me that large families can have (their|the) charges capped.',
      'I am having (trouble|difficulty) (paying|keeping up with) my (water bill|charges) since {since}.',
    ],
    more: ['I have a letter from the (council|doctor) as proof.', 'Which (form|evidence) do you need?', 'Would a meter be cheaper for us?', 'Can it be backdated to {month}?'],
  },
  {
    id: 'submit-reading', queues: { 'meter-readings': 1 }, weight: 8,
    subjects: ['Meter reading', 'Reading {reading}', 'My reading for {month}', '{account} reading', 'Water meter'],
    core: [
      'My meter reading (today|this morning|on {weekday}) is {reading}.',
      'Here is the reading for meter {meter}: {reading}.',
      'Please (take|use|note) {reading} as (our|the) reading for {month}.',
      'The (meter|dial) shows {reading} and then {small} in red.',
      'I (tried|was trying) to enter {reading} on your (website|page) but it (says|said) the number is (too low|out of range).',
    ],
    more: [
      'The photo is attached.', 'The (lid|cover) is very stiff.', 'Your last bill was an estimate.', 'I read it at {hour}.', 'Do you need the red (figures|digits) too?', 'I hope the next bill will be (correct|right) then.',
      'The serial number is {meter}.',
    ],
  },
  {
    id: 'meter-trouble', queues: { 'meter-readings': 1 }, weight: 5,
    subjects: ['Meter (not turning|faulty)', 'Cannot find (the|my) meter', 'Meter {meter}', 'Fogged up meter', 'Is this my meter?'],
    core: [
      'I cannot (find|see|read) my meter because the (chamber|box) in the (drive|pavement) is full of (water|mud).',
      'The meter {has-been} stuck on {reading} for {duration}.',
      'The number on the meter is {meter} but (the bill|your letter) says {meter}.',
      'I think (our|my) meter and the one of {neighbour} are mixed up.',
      'The glass of the meter is (cracked|fogged) and (nobody|I cannot) can read it.',
    ],
    more: ['It turns even when every tap is off.', 'Could someone come and (look|check it)?', 'The reader left a card {when}.', 'It is under the (kitchen sink|stairs).', 'My bill has been estimated {times-word} times now.'],
  },
  {
    id: 'want-meter', queues: { 'meter-readings': 0.8, 'new-connections': 0.2 }, weight: 3,
    subjects: ['Having a meter fitted', 'Meter please', 'Switch to a meter'],
    core: [
      'I (would like|want) to have a water meter (fitted|installed) at {address}.',
      'Is it possible to (go back|change) from a meter to the old (charge|rates)?',
      'We (applied|asked) for a meter {when} and have not heard anything.',
    ],
    more: ['There are only two of us.', 'The stop tap is in the (pavement|garden).', 'Does it cost anything?', 'The house has a shared supply pipe with {neighbour}.'],
  },
  {
    id: 'moving-in', queues: { 'moving-home': 1 }, weight: 7,
    subjects: ['Moving (in|house)', 'New (tenant|owner) at {address}', 'Change of address', 'We have moved', 'New home'],
    core: [
      'We (moved|are moving) into {address} (on|from) the {day} of {month}.',
      'I have (bought|rented) {address} and need to (open|set up) an account.',
      'Please (put|change) the account for {address} into my name.',
      'I am the new tenant of {address} and your letters are (still|all) addressed to somebody else.',
      'I get the keys {when-next} and want to tell you (in good time|now).',
    ],
    more: ['The meter read {reading} when we got the keys.', 'The previous (owner|tenant) was called {surname}.', 'The landlord pays nothing.', 'We are {small} people.', 'Please send (the first bill|letters) by e-mail.', 'Do I need to give a reading?', 'Our old account was {account}.'],
  },
  {
    id: 'moving-out', queues: { 'moving-home': 1 }, weight: 6,
    subjects: ['Moving out', 'Closing (my|our) account', 'Leaving {address}', '{account} please close', 'End of tenancy'],
    core: [
      'I am (moving out of|leaving) {address} on the {day} of {month}.',
      'Please close (my|the) account {account}, (we|I) left {when}.',
      'The tenancy at {address} (ends|ended) on the {day} of {month} and the flat goes back to the landlord.',
      'We have sold {address}, completion (is|was) {when}.',
      'My mother has gone into a (care home|nursing home) and her house at {address} is empty now.',
    ],
    more: ['The final reading is {reading}.', 'Please send the (final|last) bill to the new address.', 'The direct debit should stop (then|after that).', 'The new people are called {surname}.', 'Is there anything left to pay?', 'The forwarding address is {address}.'],
  },
  {
    id: 'landlord-change', queues: { 'moving-home': 1 }, weight: 3,
    subjects: ['Tenant change {address}', 'Void property', 'Letting agent: new occupier'],
    core: [
      'We (manage|let) {address} and (the tenants|your customer) left {when}.',
      'Please note the change of occupier at {address} from the {day} of {month}.',
      'The property at {address} has been empty since {month} and should be charged to nobody.',
    ],
    more: ['Names and dates are (below|attached).', 'Meter at change over: {reading}.', 'Please confirm the account number for the new occupier.', 'Bills should (go|be sent) to our office until then.'],
  },
  {
    id: 'leak-street', queues: { 'leaks-and-bursts': 1 }, weight: 7,
    subjects: ['Leak (in|on) {road}', 'Water (running|coming) down the road', 'Burst main?', 'Leak report', '(Urgent|) water leak {place}'],
    core: [
      'There is water (coming|bubbling) up through the (road|pavement) outside (number|) {house} {road}.',
      'I want to report a leak (at the corner of|on) {road} in {place}.',
      'A pipe has (burst|gone) in {road} and the water is (ankle deep|running down the hill).',
      'The stop tap cover outside {address} {has-been} leaking for {duration}.',
      'Clean water {has-been} running (into the drain|down the gutter) in {road} since {since}.',
    ],
    more: ['It is getting worse.', 'It freezes at night and is (dangerous|very slippery).', 'Cars are (splashing|driving through) it.', 'Nobody has (come|been) to look.', 'The pressure in the house is (low|down) as well.', 'A man in a van put a blue cross on the pavement {when}.', 'You wonder why our bills are so high.', 'The job number is {job}.'],
  },
  {
    id: 'leak-home', queues: { 'leaks-and-bursts': 1 }, weight: 5,
    subjects: ['Leak in the (garden|drive)', 'Supply pipe leak', 'No water', 'Low pressure', 'Frozen pipe'],
    core: [
      'We have (no water|hardly any water) (since|from) {since} and {neighbour} has none either.',
      'There is a wet patch in our (drive|garden) that never dries, and I think the supply pipe is (leaking|gone).',
      'The pressure {has-been} so low for {duration} that the shower does not work.',
      'Your leak letter says that the pipe on my side is losing water, (who repairs it|is that mine)?',
      'The pipe between the meter and the house (froze|split) {when}.',
    ],
    more: ['The meter keeps turning with everything off.', 'A plumber says it is on your side.', 'Can I claim a leak allowance on the bill?', 'The inside stop tap is stuck.', 'We have a baby and need water.', 'When will it be back on?'],
  },
  {
    id: 'dirty-water', queues: { 'water-quality': 1 }, weight: 6,
    subjects: ['(Brown|Cloudy|Yellow) water', 'Water tastes (odd|of chlorine)', 'Discoloured water in {place}', 'Is the water safe?', 'Smell from the tap'],
    core: [
      'The water from (the|our) (kitchen|cold) tap is {colour} (since|from) {since}.',
      'Our water (tastes|smells) (strongly|badly) of {taste}.',
      'There are {bits} in the water when I (fill|run) a (glass|bath).',
      'My washing has come out {colour} after using (the|your) water.',
      'Is the water in {place} safe to drink (at the moment|today)?',
    ],
    more: ['It (clears|goes away) after a few minutes.', 'The neighbours have the same.', 'We have a small child in {household}.', 'I have let the tap run for an hour.', 'My stomach has been bad since.', 'There were works in {road} {when}.', 'Can you (test|sample) it?', 'Do we get money back for the water we had to buy?'],
  },
  {
    id: 'hardness-quality', queues: { 'water-quality': 1 }, weight: 3,
    subjects: ['Water hardness', 'Lime scale', 'Lead pipes', 'Test results {place}', 'Fluoride'],
    core: [
      'How hard is the water in {postcode-area}?', 'Can you tell me the (hardness|fluoride|nitrate) figure for {place}, I need it for (my dishwasher|the aquarium|brewing).',
      'Our house is old and I think the pipe is (made of|) lead.', 'Where can I find the (latest|yearly) test results for {place}?',
    ],
    more: ['The kettle is full of (lime|scale).', 'My fish keep dying.', 'Is a filter needed?', 'We are expecting a baby.', 'Is replacing the pipe free?'],
  },
  {
    id: 'sewer-backup', queues: { 'sewer-flooding': 1 }, weight: 6,
    subjects: ['Sewage in (the|our) garden', 'Blocked (sewer|drain)', 'Manhole overflowing', 'Flooding from (drain|manhole)', 'Toilet backing up'],
    core: [
      'The manhole in (our|the) {outside} is overflowing and there is (sewage|dirty water) everywhere.',
      'Our (toilet|shower) backs up whenever {neighbour} (flushes|empties the bath).',
      'The drain in {road} is blocked and (smells|stinks) (terribly|to heaven).',
      'After the rain {when} the sewer came up into our (cellar|downstairs toilet).',
      'Foul water is running from a cover (on|in) {road} towards the (brook|school).',
    ],
    more: ['It is the {times-word} time this winter.', 'A plumber says the blockage is in the road.', 'There is paper and worse on the lawn.', 'Children play there.', 'The smell is in the whole house.', 'Who pays for the cleaning?', 'We cannot use the toilet.', 'Water is (still|also) coming in at the back door.'],
  },
  {
    id: 'drain-ownership', queues: { 'sewer-flooding': 1 }, weight: 3,
    subjects: ['Whose drain is it?', 'Shared drain {address}', 'Pumping station {place}', 'Rats / drain'],
    core: [
      'Is the drain behind {address} (yours|ours) or the council\'s?',
      'The pumping station in {road} hums all night and (gives off|has) a bad smell.',
      'The shared drain of numbers {house} to {house} has (collapsed|roots in it), our builder says.',
      'The road gully in front of {address} does not take the rain water any more.',
    ],
    more: ['We had a camera (survey|put down) and can send the film.', 'There are rats.', 'The garden is under water after every storm.', 'Is it on your sewer map?'],
  },
  {
    id: 'new-supply', queues: { 'new-connections': 1 }, weight: 5,
    subjects: ['New water connection', 'Quote for connection, plot {plot}', 'New build {place}', 'Application {job}', 'Separate supply'],
    core: [
      'We are building (a house|{small} houses) on {road} and need a (water|water and sewer) connection.',
      'Please send (me|us) a (quote|price) for a {size} mm supply to plot {plot}, {road}.',
      'I am splitting {address} into {small} flats and each needs (its own|a separate) supply.',
      'Our application {job} for a new connection {has-been} with you for {duration}.',
      'The trench for the new pipe at plot {plot} is (open|ready) and needs to be inspected.',
    ],
    more: ['The site plan is attached.', 'The builder starts in {month}.', 'We need a building supply first.', 'Is there a main in the road?', 'What are the infrastructure charges?', 'The postal address is not fixed yet.', 'The pressure there is said to be low.', 'Who fits the meter?'],
  },
  {
    id: 'build-over', queues: { 'new-connections': 1 }, weight: 3,
    subjects: ['Build over sewer', 'Extension near drain', 'Diversion of main', 'Map of pipes'],
    core: [
      'We want to build (an extension|a garage) over the sewer behind {address}.',
      'Please tell us where your (pipes|mains|sewers) run near {address}, (we|our builders) dig in {month}.',
      'The new (estate|development) at {road} will need {plot} connections for foul and surface water.',
      'Can the main across plot {plot} be moved?',
    ],
    more: ['Drawings are attached.', 'Planning permission came through {when}.', 'What does the agreement cost?', 'The architect is {surname}.', 'The drain is about {small} metres from the wall.'],
  },
  {
    id: 'poor-service', queues: { complaints: 1 }, weight: 6,
    subjects: ['Complaint', 'Very (poor|bad) service', 'Formal complaint {account}', 'Still waiting', 'Nobody (answers|calls back)'],
    core: [
      'I (wish|want) to make a (formal|) complaint about how I was treated {when}.',
      'This is the {times-word} time I write and nobody has (answered|replied).',
      'I was on hold for {hold-time} and then cut off.',
      'Your (engineer|man) (did not turn up|never came) {when}, although I took the day off.',
      'The person I spoke to was (rude|not interested) and told me to look at the website.',
    ],
    more: ['I expect an apology and compensation.', 'It started with a (wrong bill|leak|meter reading) {duration} ago.', 'I shall go to the ombudsman.', 'I was promised a call back.', 'I have been a customer for {years}.', 'All I wanted was (a correct bill|a working drain|my water back).', 'Please give this to a manager.', 'Reference {job}.'],
  },
  {
    id: 'works-damage', queues: { complaints: 1 }, weight: 4,
    subjects: ['Damage (by|after) your works', 'State of {road}', 'Claim for damage', 'Roadworks {road}'],
    core: [
      'Your contractors have left {road} in a (terrible|shocking) state.',
      'When your (men|people) repaired the (pipe|main|sewer) they broke (our wall|the drive|my fence).',
      'The hole in {road} has been open for {duration} and nobody is working there.',
      'The works in {road} started at {hour} on a Sunday without any warning.',
    ],
    more: ['I have photographs.', 'The repair will cost £{amount}.', 'Who do I send the claim to?', 'My customers cannot park.', 'The leak they came for is back.', 'I want a written answer within {small} days.'],
  },
  {
    id: 'job-application', queues: { careers: 1 }, weight: 4,
    subjects: ['Application: {post}', '{post} vacancy', 'Work experience', 'Apprenticeship', 'My CV'],
    core: [
      'I (would like|wish) to apply for the post of {post} (in|at) {place}.',
      'Please find attached my CV for the {post} (post|job).',
      'Do you (have|offer) any (apprenticeships|work experience|summer jobs) this year?',
      'I had an interview {when} and wonder (when|whether) I will hear.',
      'Is the job as {post} still open?',
    ],
    more: ['I have {years} of experience with (pumps|meters|customers|drains).', 'I can start in {month}.', 'I hold a driving licence.', 'I read meters for another company.', 'My son is sixteen and interested in water.', 'Is it possible to work part time?', 'What is the salary?'],
  },
  {
    id: 'supplier-invoice', queues: { suppliers: 1 }, weight: 4,
    subjects: ['Invoice {invoice}', 'Overdue invoice {invoice}', 'Purchase order {job}', 'Remittance', 'Statement of account {month}'],
    core: [
      'Please find attached invoice {invoice} for £{amount}.',
      'Our invoice {invoice} for £{amount} was due {when} and (is still|remains) unpaid.',
      'We have (changed|moved) our bank, (details|the new account) on our letterhead.',
      'Could you (confirm|send) the purchase order number for the (pumps|meters|pipe fittings|hire) delivered {when}?',
      'We received a payment of £{amount} and cannot match it to an invoice.',
    ],
    more: ['Payment terms are {day} days.', 'Goods were delivered to the works at {place}.', 'Please send a remittance advice.', 'Our supplier number is {job}.', 'The delivery note is signed by {surname}.', 'Who approves it?'],
  },
  {
    id: 'supplier-offer', queues: { suppliers: 1 }, weight: 2.5,
    subjects: ['Offer: {goods}', '{goods} for water companies', 'Tender {job}', 'Price list {month}'],
    core: [
      'We (make|supply) {goods} and would like to be on your list of suppliers.',
      'Our (new|) {goods} (save|find leaks and save) water and money.',
      'We are interested in tender {job} for {goods} and have a question about lot {small}.',
      'Please find our new prices for {goods}, valid from {month}.',
    ],
    more: ['May I call you {when-next}?', 'We work for several water companies.', 'A sample is free.', 'The deadline is the {day} of {month}.', 'Our insurance certificate is attached.'],
  },
  // Letters on which even the staff disagree.
  {
    id: 'high-use-unknown', queues: { billing: 0.5, 'leaks-and-bursts': 0.3, 'meter-readings': 0.2 }, weight: 1.6,
    subjects: ['Using too much water?', 'High use', 'Your letter about my use', '{account}'],
    core: [
      'Your letter says that we use {small} times as much water as last year, which cannot be (true|right).',
      'According to the bill we used {plot} cubic metres (in|for) {cycle}, I have no idea where.',
      'The meter, the bill and (what we use|my own notes) do not agree.',
    ],
    more: ['Either the meter is wrong or there is a leak.', 'I (turned|switched) everything off and looked.', 'We were away for {duration}.', 'What (do|should) I do?'],
  },
  {
    id: 'water-coming-in', queues: { 'leaks-and-bursts': 0.5, 'sewer-flooding': 0.5 }, weight: 1.2,
    subjects: ['Water in (cellar|garden)', 'Flooding', 'Water coming in', 'Help please, water'],
    core: [
      'There is water in (our|the) cellar and I do not know where it comes from.',
      'The garden of {address} is under water since {since}.',
      'Water is standing in {road} again and cannot (get away|drain).',
    ],
    more: ['It does not smell.', 'It is (clear|brown).', 'It has not rained.', 'The drain cover is (lifting|wet).', 'Is it one of your pipes?'],
  },
  {
    id: 'account-muddle', queues: { billing: 0.4, 'moving-home': 0.35, complaints: 0.25 }, weight: 1.5,
    subjects: ['Two accounts?', 'Wrong name on bill', 'Bill for a house I do not live in', 'Not my bill'],
    core: [
      'I get bills for {address}, where I do not live (any more|).',
      'There seem to be two accounts for {address}, {account} and another one.',
      'You (keep sending|have sent) a reminder to {surname}, who does not live here.',
    ],
    more: ['I told you {when}.', 'This has to stop.', 'I moved {duration} ago.', 'Who has to pay?', 'Now there is a letter from a debt collector.'],
  },
  {
    id: 'supply-off-smell', queues: { 'water-quality': 0.6, 'leaks-and-bursts': 0.2, 'sewer-flooding': 0.2 }, weight: 1,
    subjects: ['Works in {road}', 'Something wrong with the water', 'Bad smell'],
    core: [
      'Since your people worked in {road} something is wrong with (the|our) water.',
      'There is a bad smell (in the kitchen|near the sink|outside) since {since}.',
      'After the burst in {road} the water (spits|is white) and the pipes bang.',
    ],
    more: ['Could it be the drain?', 'The pressure is (up and down|odd).', 'Is that normal?', 'All houses in the row have it.'],
  },
];

/** The exchange of old meters for the Heron type, day 64 to 104: other words for well-known queues. */
// biome-ignore format: prose in tables
export const campaignTopics: readonly Topic[] = [
  {
    id: 'heron-letter', queues: { 'meter-readings': 0.75, billing: 0.15, complaints: 0.1 }, weight: 9,
    subjects: ['Heron letter', 'Green card: meter swap', 'Your Heron appointment', 'Heron exchange {account}', 'Swap visit'],
    core: [
      'I got the (letter|green card) about the Heron exchange and cannot (make|keep) the slot on {weekday}.',
      'What is a Heron and do I have to (have|accept) one?',
      'The fitter came for the swap {when} and left the old dial (in a bag|on the step).',
      'The new Heron shows (zeros|a blinking drop) and the card says to tell you.',
      'Your green card asks for the last number of the old dial: {reading}.',
    ],
    more: ['Does the radio signal harm (pets|anyone)?', 'Will I pay more with it?', 'The slot should be after {hour}.', 'The chamber is under the hedge.', 'My neighbour has had (his|hers) for {duration}.', 'The code on the card is {job}.'],
  },
];

/** From day 96 on clubs and schools ask to see the works. No queue is made for that, and nobody confirms any. */
// biome-ignore format: prose in tables
export const visitTopics: readonly Topic[] = [
  {
    id: 'visit-request', queues: { complaints: 1 }, weight: 9,
    subjects: ['Visit to the treatment works', 'School trip', 'Guided tour of {place} works?', 'Class visit', 'Open day'],
    core: [
      'Our class of {plot} pupils would like to visit the treatment works at {place}.',
      'Is there a guided tour of the works for our (club|school|scouts)?',
      'I teach (geography|science) and would like to bring {plot} pupils on a school trip.',
      'Do you hold an open day at {place} this (summer|year)?',
    ],
    more: ['The children are between {small} and twelve.', 'We would come by coach.', 'Is there a fee for the guided tour?', 'Any {weekday} in May suits the school.', 'Do the pupils need hard hats?', 'Is the tour suitable for wheelchairs?', 'We visited the windmill museum last year.', 'The trip needs a risk form from you.'],
  },
];
