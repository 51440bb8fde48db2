import { createDirectoryStore } from '../../src/store/directory.ts';

/** A process that tries one write and says how it ended. */
// Without a handler the signal of a file that may not grow ends the process before the error is seen.
process.on('SIGXFSZ', () => {});
createDirectoryStore(process.argv[2] as string)
  .put('a', new Uint8Array(100_000))
  .then(
    (result) => console.log(result.kind),
    (error) => console.log(error.name, error.code, error.place, error.got),
  );
