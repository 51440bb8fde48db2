/** An HTTP request as the intake sees it: bounded, decoded, header names in lower case. */
export interface IntakeRequest {
  readonly method: string;
  /** Decoded path segments, e.g. ['forms', 'contact']. */
  readonly path: readonly string[];
  readonly headers: Readonly<Record<string, string>>;
  readonly body: Uint8Array;
  /** Id of this request in the logs; 1 to 64 printable ASCII characters, or empty. It follows a form to its fold. */
  readonly trace: string;
}

/** Media type without parameters, lower-cased (RFC 9110 section 8.3.1); empty when absent. */
export function mediaTypeOf(request: IntakeRequest): string {
  return (request.headers['content-type'] ?? '').split(';', 1)[0]!.trim().toLowerCase();
}

/** The body as UTF-8 text; null when it is not valid UTF-8. */
export function textOf(body: Uint8Array): string | null {
  try {
    return new TextDecoder('utf-8', { fatal: true }).decode(body);
  } catch {
    return null;
  }
}

/** True when arrays and objects nest deeper than `depthMax`. Linear; looks at brackets outside strings only. */
export function nestsDeeperThan(json: string, depthMax: number): boolean {
  let depth = 0;
  let isInString = false;
  for (let i = 0; i < json.length; i++) {
    const unit = json.charCodeAt(i);
    if (isInString) {
      if (unit === 0x5c) i++;
      else if (unit === 0x22) isInString = false;
    } else if (unit === 0x22) isInString = true;
    else if (unit === 0x5b || unit === 0x7b) {
      depth++;
      if (depth > depthMax) return true;
    } else if (unit === 0x5d || unit === 0x7d) depth--;
  }
  return false;
}
