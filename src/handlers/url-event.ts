/** A function URL's event, payload format 2.0: the members that are read.
 *  Source: AWS Lambda Developer Guide, "Invoking Lambda function URLs", request payload format. */
export interface UrlEvent {
  readonly rawPath?: string;
  readonly headers?: Readonly<Record<string, string | undefined>>;
  readonly body?: string;
  readonly isBase64Encoded?: boolean;
  readonly requestContext: { readonly requestId?: string; readonly http: { readonly method: string } };
}

export interface UrlResult {
  readonly statusCode: number;
  readonly headers: Readonly<Record<string, string>>;
  readonly body: string;
}

export function methodOf({ requestContext }: UrlEvent): string {
  return requestContext.http.method.toUpperCase();
}

/** By lower-case name. */
export function headersOf(event: UrlEvent): Record<string, string> {
  const headers: Record<string, string> = {};
  for (const [name, value] of Object.entries(event.headers ?? {}))
    if (value !== undefined) headers[name.toLowerCase()] = value;
  return headers;
}

export function bodyOf({ body, isBase64Encoded }: UrlEvent): Buffer {
  return Buffer.from(body ?? '', isBase64Encoded === true ? 'base64' : 'utf8');
}
