import { execFileSync } from 'node:child_process';
import { existsSync } from 'node:fs';

/** What another parser finds in a message: CPython's e-mail package with its default policy. */
export interface ForeignReading {
  readonly file: string;
  readonly subject: string;
  /** Text of the text/plain parts that are no attachments, decoded. */
  readonly text: string;
}

const script = `
import email, email.policy, glob, importlib.util, json, os, sys
spec = importlib.util.find_spec('test')
if spec is None or not spec.submodule_search_locations: sys.exit(3)
folder = os.path.join(list(spec.submodule_search_locations)[0], 'test_email', 'data')
if not os.path.isdir(folder): sys.exit(3)
out = []
for file in sorted(glob.glob(os.path.join(folder, 'msg_*.txt'))):
    subject, texts = '', []
    try:
        with open(file, 'rb') as f: message = email.message_from_binary_file(f, policy=email.policy.default)
        subject = str(message['subject'] or '')
        for part in message.walk():
            if part.get_content_type() == 'text/plain' and part.get_content_disposition() != 'attachment' and not part.is_multipart():
                texts.append(part.get_content())
    except Exception: pass
    out.append({'file': file, 'subject': subject, 'text': '\\n'.join(texts)})
json.dump(out, sys.stdout)
`;

/** Reads CPython's own test messages (Lib/test/test_email/data) with CPython; null where a machine has none. */
export function readForeignMail(): readonly ForeignReading[] | null {
  for (const python of ['python3', '/usr/bin/python3']) {
    try {
      const json = execFileSync(python, ['-c', script], {
        encoding: 'utf8',
        stdio: ['ignore', 'pipe', 'ignore'],
      });
      const readings = JSON.parse(json) as ForeignReading[];
      return readings.length > 0 && existsSync(readings[0]!.file) ? readings : null;
    } catch {
      // No such Python, or one without its tests.
    }
  }
  return null;
}
