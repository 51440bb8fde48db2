import { createConnection } from 'node:net';
import { afterEach, describe, expect, it } from 'vitest';
import { bounds } from '../../src/bounds.ts';
import { type IntakeServer, startIntakeServer } from '../../src/cli/intake-server.ts';
import type { UrlEvent } from '../../src/handlers/url-event.ts';
import { createMemoryStore } from '../../src/store/memory.ts';
import { open } from './requests.ts';

let server: IntakeServer | null = null;
afterEach(async () => {
  await server?.close();
  server = null;
});

async function serve(port = 0) {
  const store = createMemoryStore();
  const { intake } = open(store);
  const events: UrlEvent[] = [];
  server = await startIntakeServer((event) => {
    events.push(event);
    return intake(event);
  }, port);
  const post = (path: string, body: string, headers: Record<string, string> = {}) =>
    fetch(server!.url + path, {
      method: 'POST',
      body,
      headers: { 'content-type': 'application/json', ...headers },
      redirect: 'manual',
    });
  return { store, events, url: server.url, post };
}

describe('the intake on this machine', () => {
  it('takes a form as the function does', async () => {
    const { store, events, post } = await serve();
    const answer = await post('forms/contact?utm=x', '{"topic":"bill","message":"größer"}');
    expect(answer.status).toBe(202);
    const { message } = (await answer.json()) as { message: string };
    const got = await store.get(`inbound/${message}`);
    expect(got.kind === 'found' && JSON.parse(Buffer.from(got.object.body).toString()).fields).toEqual({
      topic: 'bill',
      message: 'größer',
    });
    expect(events[0]!.requestContext.requestId).toMatch(/^[0-9a-f-]{36}$/);
    const moved = await post('forms/meter', 'reading=1', {
      'content-type': 'application/x-www-form-urlencoded',
    });
    expect([moved.status, moved.headers.get('location')]).toEqual([
      303,
      'https://www.fenmarkwater.example/thanks',
    ]);
  });

  it('answers refusals with their problem, and goes on', async () => {
    const { url, post } = await serve();
    expect((await post('forms/other', '{}')).status).toBe(404);
    expect((await post('confirmations', '{}')).status).toBe(401);
    const got = await fetch(`${url}forms/contact`);
    expect([got.status, got.headers.get('content-type')]).toEqual([405, 'application/problem+json']);
  });

  it('reads no more of a body than it needs to refuse it', async () => {
    const { events, url } = await serve();
    const { hostname, port } = new URL(url);
    const socket = createConnection(Number(port), hostname);
    let answer = '';
    socket.on('data', (chunk) => {
      answer += chunk;
    });
    socket.on('error', () => {});
    const closed = new Promise((resolve) => socket.on('close', resolve));
    // Announces a gigabyte and sends a little more than is read.
    socket.write(
      'POST /forms/contact HTTP/1.1\r\nHost: x\r\nContent-Type: application/json\r\nContent-Length: 1000000000\r\n\r\n',
    );
    socket.write('x'.repeat(bounds.intakeWebhookBytesMax + 100_000));
    await closed;
    expect(answer).toMatch(/^HTTP\/1\.1 413 /);
    expect(Buffer.from(events[0]!.body!, 'base64')).toHaveLength(bounds.intakeWebhookBytesMax + 1);
  });

  it('is bound to this machine, and says when its port is taken', async () => {
    const { url } = await serve();
    const { hostname, port } = new URL(url);
    expect(hostname).toBe('127.0.0.1');
    await expect(
      startIntakeServer(async () => ({ statusCode: 200, headers: {}, body: '' }), Number(port)),
    ).rejects.toThrow('EADDRINUSE');
  });
});
