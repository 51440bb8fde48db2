import { keys } from '../../src/store/keys.ts';
import type { Store } from '../../src/store/store.ts';

/** What mail and forms might try on whoever reads them, by their ids. Each is held, longer ago than everything else. */
const bodies: Readonly<Record<string, string>> = {
  'mail/evil-html': [
    'Content-Type: text/html; charset=utf-8',
    '',
    '<html><head><script>alert(1)</script><style>body{display:none}</style><base href="http://evil.example/"></head>',
    '<body onload="alert(2)"><img src="http://evil.example/a.png" onerror="alert(3)">',
    '<form action="/settle" method="post"><input name="queue" value="billing"><button autofocus>x</button></form>',
    '<a href="javascript:alert(4)">please click 1</a><a href="/enter?t=forged.ticket">come in here</a>',
    '<meta http-equiv="refresh" content="0;url=http://evil.example/"></body></html>',
  ].join('\r\n'),
  'mail/evil-text': [
    'Content-Type: text/plain; charset=utf-8',
    '',
    '</div></article><script>alert(5)</script><img src=http://evil.example/b.png onerror=alert(6)>',
    '\u202egnp.exe \u2066\u2067 http://evil.example/ <iframe src=//evil.example></iframe>',
    // One word of a megabyte.
    'w'.repeat(1_000_000),
  ].join('\r\n'),
};

export const hostileIds = [...Object.keys(bodies), 'forms/evil.json'];

/** Puts them into a store as the router leaves held messages. */
export async function putHostileMail(store: Store): Promise<void> {
  const metadata = (second: number) => ({
    'tallypost-decision': 'held',
    'tallypost-reason': 'unsure',
    'tallypost-at': `2020-01-01T00:00:0${second}.000Z`,
  });
  for (const [i, [id, body]] of Object.entries(bodies).entries()) {
    const mail = `From: "<script>alert(7)</script>" <e@evil.example>\r\nTo: contact@fenmarkwater.example\r\nSubject: <script>alert(8)</script>\u202e\r\nMIME-Version: 1.0\r\n${body}`;
    await store.put(keys.inbound + id, Buffer.from(mail), {
      contentType: 'message/rfc822',
      metadata: metadata(i),
    });
  }
  const form = JSON.stringify({
    form: 'contact',
    fields: { '<b>name</b>': '<script>alert(9)</script>\u202e', message: `${'x '.repeat(50)}\u0000` },
  });
  await store.put(`${keys.inbound}forms/evil.json`, Buffer.from(form), {
    contentType: 'application/json',
    metadata: metadata(9),
  });
}

export async function takeHostileMail(store: Store): Promise<void> {
  for (const id of hostileIds) await store.delete(keys.inbound + id);
}
