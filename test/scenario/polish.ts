import type { Lexicon } from './grammar.ts';
import type { SharedLanguage, Topic } from './topic.ts';

/** Letters in Polish, by topic. All invented. */
// biome-ignore format: prose in tables
export const polishTopics: readonly Topic[] = [
  {
    id: 'rachunek', queues: { billing: 1 }, weight: 6,
    subjects: ['Rachunek za wodę', 'Za wysoki rachunek', 'Pytanie o rachunek {account}', 'Płatność'],
    core: [
      'Dostałem rachunek na {amount} funtów i nie rozumiem, skąd ta kwota.', 'Rachunek za ostatni kwartał jest dwa razy wyższy niż zwykle.',
      'Proszę o zmianę daty polecenia zapłaty na {day}. dzień miesiąca.', 'Pobrali Państwo {amount} funtów z mojego konta dwa razy.', 'Chciałabym zapłacić {amount} funtów w ratach.',
    ],
    more: ['W domu mieszkają tylko dwie osoby.', 'Zapłaciłem już kartą.', 'Proszę o nowy rachunek.', 'Straciłem pracę i jest mi trudno.', 'Czy to rachunek szacunkowy?', 'Licznik był odczytany {when}.'],
  },
  {
    id: 'odczyt', queues: { 'meter-readings': 1 }, weight: 5,
    subjects: ['Odczyt licznika', 'Stan wodomierza', 'Licznik {meter}'],
    core: ['Podaję stan licznika: {reading}.', 'Wodomierz o numerze {meter} pokazuje {reading}.', 'Nie mogę znaleźć licznika przy domu.', 'Licznik stoi w miejscu od {since}.', 'Na stronie nie da się wpisać odczytu {reading}.'],
    more: ['W załączniku jest zdjęcie.', 'Pokrywa jest bardzo ciężka.', 'Ostatni rachunek był szacunkowy.', 'Kiedy ktoś przyjdzie?', 'Numer konta to {account}.'],
  },
  {
    id: 'przeprowadzka', queues: { 'moving-home': 1 }, weight: 5,
    subjects: ['Przeprowadzka', 'Zmiana adresu', 'Nowy najemca', 'Zamknięcie konta {account}'],
    core: ['Przeprowadzamy się {when-next} na {address}.', 'Od {day}. dnia miesiąca mieszkam pod adresem {address}.', 'Proszę zamknąć konto {account}, wyprowadziliśmy się {when}.', 'Jestem nowym najemcą i potrzebuję konta na swoje nazwisko.'],
    more: ['Stan licznika w dniu przekazania kluczy: {reading}.', 'Poprzedni najemca wyjechał.', 'Proszę wysłać ostatni rachunek na nowy adres.', 'Jest nas {small}.', 'Czy muszę podać odczyt?'],
  },
  {
    id: 'wyciek', queues: { 'leaks-and-bursts': 1 }, weight: 5,
    subjects: ['Wyciek wody', 'Pęknięta rura', 'Nie ma wody', 'Woda na ulicy'],
    core: ['Na ulicy {road} płynie woda spod asfaltu.', 'Pękła rura przed domem {address}.', 'Od {since} nie mamy wody.', 'Ciśnienie jest tak słabe, że prysznic nie działa.', 'W ogrodzie jest mokro, chyba cieknie rura.'],
    more: ['Nikt jeszcze nie przyjechał.', 'Sąsiedzi też nie mają wody.', 'W nocy robi się lód.', 'Mamy małe dziecko.', 'Kiedy woda wróci?', 'Licznik cały czas się kręci.'],
  },
  {
    id: 'jakosc', queues: { 'water-quality': 1 }, weight: 4,
    subjects: ['Brązowa woda', 'Jakość wody', 'Woda śmierdzi', 'Twardość wody'],
    core: ['Z kranu leci brązowa woda od {since}.', 'Woda pachnie chlorem i ma dziwny smak.', 'Czy wodę w {place} można pić?', 'W wodzie pływają białe drobinki.', 'Jaka jest twardość wody w {place}?'],
    more: ['Mamy małe dziecko.', 'U sąsiadów jest tak samo.', 'Pranie wyszło żółte.', 'Czy mogą Państwo zbadać wodę?', 'Na ulicy były roboty.'],
  },
  {
    id: 'kanalizacja', queues: { 'sewer-flooding': 1 }, weight: 4,
    subjects: ['Zatkana kanalizacja', 'Ścieki w ogrodzie', 'Studzienka'],
    core: ['Studzienka w ogrodzie wylewa i wszędzie są ścieki.', 'Toaleta się cofa, kiedy sąsiad spuszcza wodę.', 'Po deszczu ścieki weszły do piwnicy.', 'Kanał na {road} jest zatkany i bardzo śmierdzi.'],
    more: ['To już trzeci raz.', 'Bawią się tam dzieci.', 'Kto zapłaci za sprzątanie?', 'Nie możemy korzystać z toalety.', 'Woda stoi w ogrodzie.'],
  },
  {
    id: 'przylacze', queues: { 'new-connections': 1 }, weight: 2.5,
    subjects: ['Nowe przyłącze', 'Przyłącze wody, działka {plot}'],
    core: ['Budujemy dom na działce {plot} i potrzebujemy przyłącza wody.', 'Proszę o wycenę przyłącza przy {road}.', 'Chcemy dobudować pokój nad kanałem za domem.', 'Dzielę dom na {small} mieszkania i każde potrzebuje licznika.'],
    more: ['Plan jest w załączniku.', 'Budowa zaczyna się w maju.', 'Ile to kosztuje?', 'Czy w ulicy jest rura?'],
  },
  {
    id: 'skarga', queues: { complaints: 1 }, weight: 3.5,
    subjects: ['Skarga', 'Reklamacja', 'Brak odpowiedzi'],
    core: ['Składam skargę na obsługę.', 'Piszę trzeci raz i nikt nie odpowiada.', 'Pracownik nie przyszedł {when}, chociaż wziąłem wolne.', 'Po Państwa robotach {road} wygląda strasznie.', 'Czekałam godzinę na linii.'],
    more: ['Żądam odszkodowania.', 'Zaczęło się od złego rachunku.', 'Proszę o kontakt z kierownikiem.', 'Mam zdjęcia.', 'Chcę odpowiedzi na piśmie.'],
  },
  {
    id: 'praca', queues: { careers: 1 }, weight: 3,
    subjects: ['Praca', 'Moje CV', 'Czy szukają Państwo pracowników?'],
    core: ['Chciałbym pracować w Państwa firmie jako hydraulik.', 'Przesyłam moje CV.', 'Czy mają Państwo wolne miejsca w {place}?', 'Czy przyjmują Państwo uczniów na praktykę?'],
    more: ['Mam {small} lat doświadczenia przy pompach.', 'Mam prawo jazdy.', 'Mogę zacząć od zaraz.', 'Znam angielski i niemiecki.'],
  },
  {
    id: 'dostawca', queues: { suppliers: 1 }, weight: 2,
    subjects: ['Faktura {invoice}', 'Oferta'],
    core: ['W załączniku faktura {invoice} na {amount} funtów.', 'Faktura {invoice} nie została zapłacona.', 'Nasza firma produkuje rury i zawory.'],
    more: ['Termin minął {when}.', 'Proszę o numer zamówienia.', 'Chętnie wyślemy cennik.'],
  },
  {
    id: 'niejasne', queues: { billing: 0.4, 'leaks-and-bursts': 0.3, 'meter-readings': 0.3 }, weight: 1.2,
    subjects: ['Duże zużycie', 'Pytanie', 'Państwa list'],
    core: ['W liście piszą Państwo, że zużywamy za dużo wody.', 'Rachunek i licznik się nie zgadzają.', 'Nie wiem, skąd takie zużycie.'],
    more: ['Może licznik jest zepsuty albo coś cieknie.', 'Nie było nas w domu.', 'Co mam zrobić?'],
  },
];

// biome-ignore format: prose in tables
export const polishShared: SharedLanguage = {
  subjects: ['Pytanie', 'Prośba', 'Konto {account}', 'Dzień dobry', ''],
  greetings: ['Dzień dobry,', 'Szanowni Państwo,', 'Witam,', ''],
  openers: ['Mój numer konta to {account}.', 'Piszę w sprawie {address}.', 'Dzwoniłem {when} i kazano mi napisać.', 'Dziękuję za list.', 'Przepraszam za mój angielski, więc piszę po polsku.'],
  context: ['Mieszkamy tu od {since}.', 'Płacę poleceniem zapłaty.', 'Licznik jest na chodniku.', 'Pracuję w nocy.', 'Wysłałam zdjęcie {when}.', 'Na {road} są roboty.', 'Kran w kuchni działa.', 'Sąsiad wie więcej.', 'Właściciel mówi, że to Państwa sprawa.', 'Rachunek był zawsze w porządku.'],
  chatter: ['Mam nadzieję, że weekend był miły.', 'Pogoda okropna.', 'Przepraszam za błędy.', 'Pozdrawiam cały zespół.'],
  asks: ['Proszę o odpowiedź.', 'Proszę o telefon: {phone}.', 'Co mam zrobić?', 'Kiedy mogę się spodziewać odpowiedzi?', 'Czy mogą Państwo kogoś przysłać?', 'Proszę to sprawdzić.'],
  asides: ['A przy okazji: ', 'Jeszcze jedno: ', 'PS: '],
  closings: ['Pozdrawiam', 'Z poważaniem', 'Dziękuję', 'Z wyrazami szacunku'],
  short: ['Czy są jakieś wiadomości? {account}', 'Proszę o telefon: {phone}.', 'Dziękuję, już działa.', 'W załączniku zdjęcie.', 'Tak, {weekday} mi pasuje.', 'Nikt jeszcze nie był.'],
  forwards: ['Proszę zobaczyć poniżej.', 'Przesyłam dalej.'],
  attribution: 'W dniu {date}, {who} pisze:',
  forwardRule: '-------- Wiadomość przekazana --------',
  sentFrom: ['Wysłano z telefonu'],
};

// biome-ignore format: prose in tables
export const polishLexicon: Lexicon = {
  when: ['wczoraj', 'w zeszłym tygodniu', 'w poniedziałek', 'dziś rano', '{small} dni temu', 'w lutym'],
  'when-next': ['w przyszłym tygodniu', 'jutro', 'w sobotę'],
  since: ['wczoraj', 'tygodnia', 'miesiąca', 'rana', 'niedzieli'],
  weekday: ['poniedziałek', 'środa', 'piątek'],
  address: ['{street}', '{house} {road}', '{street}, {town}'],
};
