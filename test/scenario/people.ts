import type { Lexicon } from './grammar.ts';
import type { Chance } from './random.ts';

/** Invented throughout: people, streets and places of the Fenmark district. Telephone numbers are of the ranges
 *  that Ofcom keeps free for drama (01632 960000-960999, 07700 900000-900999); no postcode area is called FW. */

// biome-ignore format: a list of names
export const towns = [
  'Harrowfen', 'Ousemere', 'Tillbeck', 'Netherfleet', 'Saltmarch', 'Brackwater', 'Eastlode', 'Thornelode',
  'Cawdry St Agnes', 'Lower Pellbrook', 'Wythemoor', 'Garrow Bridge',
] as const;

// biome-ignore format: a list of names
const streetNames = [
  'Sluice', 'Heron', 'Bittern', 'Osier', 'Reedbed', 'Chandler', 'Mill Dyke', 'Weir', 'Cutter', 'Eel Pie',
  'Windmill', 'Cooper', 'Lode', 'Pump House', 'Tannery', 'Lapwing', 'Otter', 'Willow Garth', 'Barley', 'Ferry',
] as const;
const streetKinds = ['Lane', 'Street', 'Road', 'Close', 'Avenue', 'Row', 'Drive', 'Terrace', 'Way'] as const;

// biome-ignore format: a list of names
const firstNames = {
  english: [
    'Maud', 'Tobias', 'Imogen', 'Desmond', 'Priya', 'Callum', 'Wilfred', 'Aisha', 'Rosalind', 'Gareth', 'Fenella',
    'Kofi', 'Beatrix', 'Hamish', 'Leila', 'Percival', 'Dilys', 'Rashid', 'Marjorie', 'Owen', 'Thandi', 'Rupert',
  ],
  polish: ['Bożena', 'Grzegorz', 'Halina', 'Łukasz', 'Małgorzata', 'Zbigniew', 'Kinga', 'Wojciech', 'Agnieszka', 'Paweł'],
  german: ['Jürgen', 'Heike', 'Matthias', 'Gudrun', 'Jörg', 'Annegret', 'Tobias', 'Käthe', 'Björn', 'Ursula'],
} as const;

// biome-ignore format: a list of names
const lastNames = {
  english: [
    'Ashdrake', 'Pellowe', 'Quillfether', 'Marrack', 'Tarrowby', 'Fennimoor', 'Oakhollow', 'Brindlecombe', 'Sedgeley',
    'Wickstaff', 'Okparanta-Reed', 'Chaudry', 'Larkspur', 'Trevannick', 'Hobday', 'Mossop', 'Inglesham', 'Vane-Tarry',
  ],
  polish: ['Jodłowicz', 'Wierzbnicka', 'Sośniak', 'Brzozowiak', 'Olszynka', 'Dąbrówko', 'Trzcińska', 'Żurawik'],
  german: ['Brinkholt', 'Seewaldt', 'Mühlgraber', 'Deichmöller', 'Fährmann-Lüth', 'Rohrbeck', 'Torfstecher', 'Kieswetter'],
} as const;

export type Language = keyof typeof firstNames;

export interface Person {
  readonly language: Language;
  readonly name: string;
  readonly firstName: string;
  readonly address: string;
  readonly account: string;
  readonly meter: string;
  readonly phone: string;
  readonly street: string;
  readonly town: string;
  readonly postcode: string;
}

const publicProviders = [
  'postbox.example',
  'fastpost.example',
  'mailhaus.test',
  'skrzynka.test',
  'inkwell.example',
] as const;

export const digits = (count: number) => (chance: Chance) =>
  Array.from({ length: count }, () => chance.below(10)).join('');

const plainLetters: Readonly<Record<string, string>> = { ł: 'l', Ł: 'L', ß: 'ss' };

export function inventPerson(language: Language, chance: Chance): Person {
  const firstName = chance.pick<string>(firstNames[language]);
  const lastName = chance.pick<string>(lastNames[language]);
  const local = `${firstName}.${lastName}`
    .toLowerCase()
    .replace(/[łß]/g, (letter) => plainLetters[letter] as string)
    .normalize('NFD')
    .replace(/\p{M}/gu, '');
  const number = chance.isTrue(0.4) ? String(1 + chance.below(98)) : '';
  return {
    language,
    name: `${firstName} ${lastName}`,
    firstName,
    address: `${chance.isTrue(0.2) ? local[0] + local.slice(local.indexOf('.') + 1) : local}${number}@${chance.pick<string>(publicProviders)}`,
    account: `FW-${digits(8)(chance)}`,
    meter: `HM${digits(6)(chance)}`,
    phone: chance.isTrue(0.5) ? `01632 960${digits(3)(chance)}` : `07700 900${digits(3)(chance)}`,
    street: `${1 + chance.below(140)} ${chance.pick<string>(streetNames)} ${chance.pick<string>(streetKinds)}`,
    town: chance.pick<string>(towns),
    postcode: `FW${1 + chance.below(9)} ${1 + chance.below(9)}${'ABDEFGHJ'[chance.below(8)]}${'LNPQRSTU'[chance.below(8)]}`,
  };
}

/** Holes that every language has. */
export const commonLexicon: Lexicon = {
  road: (chance) => `${chance.pick<string>(streetNames)} ${chance.pick<string>(streetKinds)}`,
  place: towns,
  amount: (chance) => `${20 + chance.below(480)}.${digits(2)(chance)}`,
  pounds: (chance) => String(20 + chance.below(600)),
  reading: digits(5),
  house: (chance) => String(1 + chance.below(140)),
  invoice: (chance) => `INV-${digits(6)(chance)}`,
  job: (chance) => `J${digits(6)(chance)}`,
  plot: (chance) => String(1 + chance.below(60)),
  small: (chance) => String(2 + chance.below(7)),
  day: (chance) => String(1 + chance.below(28)),
};
