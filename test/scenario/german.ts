import type { Lexicon } from './grammar.ts';
import type { SharedLanguage, Topic } from './topic.ts';

/** Letters in German, by topic. All invented. */
// biome-ignore format: prose in tables
export const germanTopics: readonly Topic[] = [
  {
    id: 'rechnung', queues: { billing: 1 }, weight: 6,
    subjects: ['Wasserrechnung', 'Rechnung zu hoch', 'Frage zur Rechnung {account}', 'Lastschrift'],
    core: [
      'Die Rechnung über {amount} Pfund ist doppelt so hoch wie sonst.', 'Ich verstehe nicht, wie Sie auf {amount} Pfund kommen.', 'Bitte buchen Sie erst am {day}. des Monats ab.',
      'Sie haben {amount} Pfund zweimal abgebucht.', 'Mein Konto hat ein Guthaben von {amount} Pfund, das ich gern zurück hätte.',
    ],
    more: ['Wir sind nur zu zweit.', 'Ich habe schon mit Karte bezahlt.', 'Kann ich in Raten zahlen?', 'Der Zähler wurde {when} abgelesen.', 'Meine Bank hat sich geändert.', 'Ist das eine Schätzung?'],
  },
  {
    id: 'zaehler', queues: { 'meter-readings': 1 }, weight: 5,
    subjects: ['Zählerstand', 'Wasserzähler {meter}', 'Ablesung'],
    core: ['Der Zählerstand ist heute {reading}.', 'Zähler {meter} zeigt {reading}.', 'Ich finde den Wasserzähler nicht.', 'Der Zähler steht {since} still.', 'Ihre Seite nimmt den Stand {reading} nicht an.'],
    more: ['Ein Foto liegt bei.', 'Der Deckel klemmt.', 'Die letzte Rechnung war geschätzt.', 'Wann kommt jemand?', 'Meine Kundennummer ist {account}.'],
  },
  {
    id: 'umzug', queues: { 'moving-home': 1 }, weight: 5,
    subjects: ['Umzug', 'Neue Adresse', 'Auszug', 'Kündigung {account}'],
    core: ['Wir ziehen {when-next} in das Haus {address}.', 'Seit dem {day}. wohne ich in {address}.', 'Bitte schließen Sie das Konto {account}, wir sind {when} ausgezogen.', 'Ich bin der neue Mieter und brauche ein eigenes Konto.'],
    more: ['Zählerstand bei Übergabe: {reading}.', 'Der Vormieter ist unbekannt verzogen.', 'Bitte schicken Sie die letzte Rechnung an die neue Adresse.', 'Wir sind {small} Personen.', 'Die Lastschrift soll dann enden.'],
  },
  {
    id: 'rohrbruch', queues: { 'leaks-and-bursts': 1 }, weight: 5,
    subjects: ['Rohrbruch', 'Wasser auf der Straße', 'Kein Wasser', 'Leck'],
    core: ['In der {road} läuft Wasser aus dem Gehweg.', 'Vor dem Haus {address} ist ein Rohr gebrochen.', 'Wir haben {since} kein Wasser.', 'Der Druck ist so schwach, dass die Dusche nicht geht.', 'Im Garten ist es nass, ich glaube, die Leitung leckt.'],
    more: ['Es ist noch niemand gekommen.', 'Die Nachbarn haben auch keins.', 'Nachts friert es.', 'Wann ist es wieder da?', 'Der Zähler dreht sich immer.', 'Wir haben ein Baby.'],
  },
  {
    id: 'qualitaet', queues: { 'water-quality': 1 }, weight: 4,
    subjects: ['Braunes Wasser', 'Wasserqualität', 'Wasserhärte', 'Geruch'],
    core: ['Aus dem Hahn kommt {since} braunes Wasser.', 'Das Wasser riecht nach Chlor.', 'Kann man das Wasser in {place} trinken?', 'Im Wasser schwimmen weiße Flocken.', 'Wie hart ist das Wasser in {place}?'],
    more: ['Wir haben ein Baby.', 'Bei den Nachbarn ist es genauso.', 'Die Wäsche ist gelb geworden.', 'Können Sie eine Probe nehmen?', 'In der Straße wurde gearbeitet.'],
  },
  {
    id: 'kanal', queues: { 'sewer-flooding': 1 }, weight: 4,
    subjects: ['Kanal verstopft', 'Abwasser im Garten', 'Gully'],
    core: ['Der Schacht im Garten läuft über, überall ist Abwasser.', 'Die Toilette läuft zurück, wenn der Nachbar spült.', 'Nach dem Regen kam Abwasser in den Keller.', 'Der Kanal in der {road} ist verstopft und stinkt.'],
    more: ['Das ist schon das dritte Mal.', 'Dort spielen Kinder.', 'Wer bezahlt die Reinigung?', 'Wir können die Toilette nicht benutzen.', 'Das Wasser steht im Garten.'],
  },
  {
    id: 'anschluss', queues: { 'new-connections': 1 }, weight: 2.5,
    subjects: ['Neuer Anschluss', 'Hausanschluss Grundstück {plot}'],
    core: ['Wir bauen auf Grundstück {plot} und brauchen einen Wasseranschluss.', 'Bitte schicken Sie ein Angebot für einen Anschluss in der {road}.', 'Wir möchten über dem Kanal hinter dem Haus anbauen.', 'Ich teile das Haus in {small} Wohnungen, jede braucht einen Zähler.'],
    more: ['Der Plan liegt bei.', 'Der Bau beginnt im Mai.', 'Was kostet das?', 'Liegt in der Straße eine Leitung?'],
  },
  {
    id: 'beschwerde', queues: { complaints: 1 }, weight: 3.5,
    subjects: ['Beschwerde', 'Keine Antwort', 'Schlechter Service'],
    core: ['Ich möchte mich über Ihren Service beschweren.', 'Ich schreibe zum dritten Mal, und niemand antwortet.', 'Ihr Mitarbeiter ist {when} nicht gekommen, obwohl ich Urlaub genommen hatte.', 'Nach Ihren Arbeiten sieht die {road} furchtbar aus.', 'Ich hing eine Stunde in der Leitung.'],
    more: ['Ich verlange Schadenersatz.', 'Angefangen hat es mit einer falschen Rechnung.', 'Bitte geben Sie das dem Leiter.', 'Ich habe Fotos.', 'Ich erwarte eine schriftliche Antwort.'],
  },
  {
    id: 'bewerbung', queues: { careers: 1 }, weight: 3,
    subjects: ['Bewerbung', 'Freie Stellen?', 'Praktikum'],
    core: ['Ich bewerbe mich als Klempner.', 'Anbei mein Lebenslauf.', 'Haben Sie freie Stellen in {place}?', 'Bieten Sie Praktika an?'],
    more: ['Ich habe {small} Jahre mit Pumpen gearbeitet.', 'Ich habe einen Führerschein.', 'Ich kann sofort anfangen.', 'Ich spreche Englisch und Polnisch.'],
  },
  {
    id: 'lieferant', queues: { suppliers: 1 }, weight: 2.5,
    subjects: ['Rechnung {invoice}', 'Angebot', 'Mahnung {invoice}'],
    core: ['Anbei unsere Rechnung {invoice} über {amount} Pfund.', 'Unsere Rechnung {invoice} ist noch offen.', 'Wir stellen Pumpen und Armaturen her.'],
    more: ['Sie war {when} fällig.', 'Bitte nennen Sie uns die Bestellnummer.', 'Gern senden wir die Preisliste.'],
  },
  {
    id: 'unklar', queues: { billing: 0.4, 'leaks-and-bursts': 0.3, 'meter-readings': 0.3 }, weight: 1.2,
    subjects: ['Hoher Verbrauch', 'Frage', 'Ihr Schreiben'],
    core: ['Sie schreiben, dass wir zu viel Wasser verbrauchen.', 'Rechnung und Zähler passen nicht zusammen.', 'Ich weiß nicht, woher der Verbrauch kommt.'],
    more: ['Entweder ist der Zähler kaputt, oder es leckt etwas.', 'Wir waren verreist.', 'Was soll ich tun?'],
  },
];

// biome-ignore format: prose in tables
export const germanShared: SharedLanguage = {
  subjects: ['Frage', 'Anfrage', 'Konto {account}', 'Bitte um Hilfe', ''],
  greetings: ['Guten Tag,', 'Sehr geehrte Damen und Herren,', 'Hallo,', ''],
  openers: ['Meine Kundennummer ist {account}.', 'Es geht um {address}.', 'Ich habe {when} angerufen und sollte schreiben.', 'Danke für Ihren Brief.', 'Mein Englisch ist schlecht, daher auf Deutsch.'],
  context: ['Wir wohnen hier schon lange.', 'Ich zahle per Lastschrift.', 'Der Zähler ist im Gehweg.', 'Ich arbeite nachts.', 'Ein Foto habe ich {when} geschickt.', 'In der {road} wird gebaut.', 'Der Hahn in der Küche geht.', 'Der Nachbar weiß mehr.', 'Der Vermieter sagt, das sei Ihre Sache.', 'Die Rechnung war immer in Ordnung.'],
  chatter: ['Ich hoffe, Sie hatten ein schönes Wochenende.', 'Was für ein Wetter.', 'Entschuldigen Sie die Tippfehler.', 'Grüße auch an die nette Dame am Telefon.'],
  asks: ['Bitte melden Sie sich.', 'Bitte rufen Sie mich an: {phone}.', 'Was soll ich tun?', 'Wann kann ich mit einer Antwort rechnen?', 'Können Sie jemanden schicken?', 'Bitte prüfen Sie das.'],
  asides: ['Übrigens: ', 'Noch etwas: ', 'PS: '],
  closings: ['Mit freundlichen Grüßen', 'Viele Grüße', 'Danke', 'Beste Grüße'],
  short: ['Gibt es etwas Neues? {account}', 'Bitte rufen Sie mich an: {phone}.', 'Danke, es geht wieder.', 'Anbei das Foto.', 'Ja, {weekday} passt.', 'Es war noch niemand da.'],
  forwards: ['Bitte siehe unten.', 'Zur Kenntnis weitergeleitet.'],
  attribution: 'Am {date} schrieb {who}:',
  forwardRule: '-------- Weitergeleitete Nachricht --------',
  sentFrom: ['Von meinem Telefon gesendet'],
};

// biome-ignore format: prose in tables
export const germanLexicon: Lexicon = {
  when: ['gestern', 'letzte Woche', 'am Montag', 'heute früh', 'vor {small} Tagen', 'im Februar'],
  'when-next': ['nächste Woche', 'morgen', 'am Samstag'],
  since: ['seit gestern', 'seit einer Woche', 'seit heute früh', 'seit Sonntag', 'seit Tagen'],
  weekday: ['Montag', 'Mittwoch', 'Freitag'],
  address: ['{street}', '{house} {road}', '{street}, {town}'],
};
