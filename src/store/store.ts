/** The one port to the world's objects. Strongly consistent per key; nothing is atomic across keys. */

export interface ObjectHead {
  readonly key: string;
  /** Opaque, compared by equality only; of equal bytes it may be equal. */
  readonly etag: string;
  readonly bytes: number;
  readonly modifiedAtMs: number;
  readonly contentType: string;
  /** User metadata: lower-case keys, ASCII values, at most 2 KB together. */
  readonly metadata: Readonly<Record<string, string>>;
}

export interface StoredObject extends ObjectHead {
  readonly body: Uint8Array;
}

export type GetResult =
  | { readonly kind: 'found'; readonly object: StoredObject }
  | { readonly kind: 'not-modified' }
  | { readonly kind: 'missing' };

/** `lost`: the condition did not hold, or another write ran at the same time; read again. The write may still have
 *  landed when an answer was lost on the way: look for your own writer id before trying again. */
export type PutResult = { readonly kind: 'written'; readonly etag: string } | { readonly kind: 'lost' };

export interface PutOptions {
  /** Write only over this version. */
  readonly ifMatch?: string;
  /** Write only where there is nothing. */
  readonly ifNoneMatch?: '*';
  readonly contentType?: string;
  readonly metadata?: Readonly<Record<string, string>>;
}

export interface Store {
  /** Human-readable place, for messages: a directory path or `s3://bucket/prefix`. */
  readonly place: string;
  /** Throws TallypostError `object-too-large`, before the body is read, when it has more than `bytesMax`. */
  get(
    key: string,
    options?: { readonly ifNoneMatch?: string; readonly bytesMax?: number },
  ): Promise<GetResult>;
  /** The body in chunks of bounded size, for large objects; null when missing. Read the chunks, or stop reading them:
   *  until then the file or the connection is held. */
  stream(
    key: string,
  ): Promise<{ readonly head: ObjectHead; readonly chunks: AsyncIterable<Uint8Array> } | null>;
  head(key: string): Promise<ObjectHead | null>;
  put(key: string, body: Uint8Array, options?: PutOptions): Promise<PutResult>;
  /** Keys that start with `prefix`, ascending by UTF-8 bytes, after `after` when given. Metadata and content type are not read. */
  list(
    prefix: string,
    options?: { readonly after?: string },
  ): AsyncIterable<Pick<ObjectHead, 'key' | 'etag' | 'bytes' | 'modifiedAtMs'>>;
  /** Deletes; no error when there is nothing. With `ifMatch` only this version: whatever stands there by then stays. */
  delete(key: string, options?: { readonly ifMatch?: string }): Promise<void>;
  /** Replaces all user metadata, keeping body and content type; `lost` when the object changed since `ifMatch`; `missing` when gone. */
  replaceMetadata(
    key: string,
    metadata: Readonly<Record<string, string>>,
    options: { readonly ifMatch: string },
  ): Promise<PutResult | { readonly kind: 'missing' }>;
}
