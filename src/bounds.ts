/** Every bound of the project, each with its reason. Units stand last in the name. */
export const bounds = {
  /** Largest raw message read: the receiving service accepts 40 MB with headers. */
  rawBytesMax: 40 * 1024 * 1024,
} as const;
