/** What the intake answers, and its problem bodies (RFC 9457). Values only. */

export interface Reply {
  readonly status: number;
  readonly headers: Readonly<Record<string, string>>;
  readonly body: string;
  /** Key of the object written, or found written before, for the log; absent: none. */
  readonly stored?: string;
}

/** One fault inside a request: a JSON Pointer into what was sent, and what was expected there. */
export interface FieldFault {
  readonly pointer: string;
  readonly expected: string;
}

/** Never shown in a frame, never cached, never sniffed: the answer holds ids of messages. */
const alwaysHeaders = {
  'cache-control': 'no-store',
  'x-content-type-options': 'nosniff',
} as const;

export function replyJson(
  status: number,
  value: unknown,
  headers: Readonly<Record<string, string>> = {},
): Reply {
  return {
    status,
    headers: { 'content-type': 'application/json', ...alwaysHeaders, ...headers },
    body: JSON.stringify(value),
  };
}

const titles: Readonly<Record<number, string>> = {
  400: 'The request cannot be read',
  401: 'The signature does not hold',
  403: 'This origin may not post here',
  404: 'There is nothing here',
  405: 'This method is not served here',
  413: 'The body is too large',
  415: 'This media type is not read here',
  422: 'The content does not fit',
  503: 'The store did not answer; send it again',
};

/** A problem details object (RFC 9457 section 3): type, title, status, detail, and `errors` with JSON Pointers.
 *  `code` is stable and kebab-case. Never repeats what was sent. */
export function replyProblem(
  status: number,
  code: string,
  detail: string,
  more: { readonly errors?: readonly FieldFault[]; readonly headers?: Readonly<Record<string, string>> } = {},
): Reply {
  const body = {
    type: `urn:tallypost:problem:${code}`,
    title: titles[status] ?? 'The request was refused',
    status,
    detail,
    ...(more.errors === undefined ? {} : { errors: more.errors }),
  };
  return {
    status,
    headers: { 'content-type': 'application/problem+json', ...alwaysHeaders, ...more.headers },
    body: JSON.stringify(body),
  };
}
