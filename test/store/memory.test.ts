import { createMemoryStore } from '../../src/store/memory.ts';
import { describeContract } from './contract.ts';

describeContract('memory', async () => ({ store: createMemoryStore() }));
