import { writeFileSync } from 'node:fs';
import { labelledLines } from './labelled.ts';
import { generateScenario } from './scenario.ts';

/** Writes the scenario as a labelled history: `node … FILE [SEED [MESSAGES]]`. */
const [file, seed = '1', messages = '2400'] = process.argv.slice(2);
if (file === undefined) throw new Error('expected the path of the file to write');
writeFileSync(file, labelledLines(generateScenario(Number(seed), { messages: Number(messages) }).messages));
