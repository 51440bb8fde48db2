import { TallypostError } from '../errors.ts';

/** The system's error codes (errno(3)) as errors of our own; `got` holds the code, the cause the rest. */
const faults: Readonly<Record<string, readonly [code: string, expected: string]>> = {
  ENOSPC: ['store-full', 'space on the disk'],
  EDQUOT: ['store-full', 'space in the quota'],
  EFBIG: ['store-full', 'a file size that the system allows'],
  EACCES: ['store-refused', 'permission to read and write here'],
  EPERM: ['store-refused', 'permission to read and write here, and a file system with hard links'],
  EROFS: ['store-refused', 'a file system that can be written'],
  ENOTSUP: ['store-unsupported', 'a file system with hard links'],
  EXDEV: ['store-unsupported', 'one file system below the directory'],
  ENOTDIR: ['store-refused', 'a directory'],
  EEXIST: ['store-refused', 'a directory'],
  EMFILE: ['store-busy', 'a free file descriptor'],
  ENFILE: ['store-busy', 'a free file descriptor'],
};

function asStoreError(place: string, error: unknown): unknown {
  const errno = (error as NodeJS.ErrnoException | null)?.code;
  if (error instanceof TallypostError || errno === undefined) return error;
  const [code, expected] = faults[errno] ?? ['store-failed', 'the file system to answer'];
  return new TallypostError({ code, place, expected, got: errno }, error);
}

/** Runs work on the file system, now or as a promise, and turns the system's errors into ours. */
export function guarded<T>(place: string, work: () => T): T {
  try {
    const result = work();
    if (!(result instanceof Promise)) return result;
    return result.catch((error: unknown) => {
      throw asStoreError(place, error);
    }) as T;
  } catch (error) {
    throw asStoreError(place, error);
  }
}
