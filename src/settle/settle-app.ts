import { bounds } from '../bounds.ts';
import { TallypostError } from '../errors.ts';
import { strictPolicy } from '../html/policy.ts';
import { mapBounded } from '../ledger/pace.ts';
import type { World } from '../ledger/world.ts';
import type { Message } from '../message/message.ts';
import { keys } from '../store/keys.ts';
import { type Bench, titleIn, weighMessage, whatItTeaches } from './likelihood.ts';
import { dropLeft, finishSettling, heldOf, holdSettlement, type OnDropped, takeBack } from './pending.ts';
import { whyWords } from './reasons.ts';
import {
  doorPage,
  type Frame,
  type Last,
  listPage,
  messageHref,
  messagePage,
  messageTitle,
  problemPage,
} from './settle-pages.ts';
import { settleScript } from './settle-script.ts';
import { settleStyle } from './settle-style.ts';
import { readTicket, signTicket, type Ticket, type TicketKey, usedMark } from './ticket.ts';
import type { Waiting, WaitingList } from './waiting.ts';

export interface SettleDeps {
  readonly world: World;
  /** Desk and model as last committed; rejects with a TallypostError. */
  readonly openBench: () => Promise<Bench>;
  /** Reads and parses a message by its inbound key; null when it is gone. */
  readonly readMessage: (key: string) => Promise<Message | null>;
  readonly waiting: WaitingList;
  readonly ticketKey: TicketKey;
  /** Scheme, host and port as the browser names them; requests of other origins change nothing. */
  readonly origin: string;
  /** Path before ours, without a slash at its end. */
  readonly base: string;
  readonly onDropped: OnDropped;
}

export interface SettleRequest {
  readonly method: string;
  /** Below `base`, beginning with a slash. */
  readonly path: string;
  readonly query: URLSearchParams;
  /** Lower-case names. */
  readonly headers: Readonly<Record<string, string | undefined>>;
  readonly body: Uint8Array;
}

export interface SettleReply {
  readonly status: number;
  readonly headers: Readonly<Record<string, string>>;
  readonly body: string;
}

/** Answers requests of the page for held messages. Holds nothing between requests but what `deps` holds, so that it serves a
 *  local server and a function behind a URL alike. */
export type SettleApp = (request: SettleRequest) => Promise<SettleReply>;

/** With Secure and the whole origin as its path, a cookie of this prefix can be set by no other host (RFC 6265bis, 4.1.3.2). */
function cookieNameOf({ origin, base }: SettleDeps): string {
  return origin.startsWith('https:') && base === '' ? '__Host-tallypost-settle' : 'tallypost-settle';
}

export function createSettleApp(deps: SettleDeps): SettleApp {
  return async (request) => {
    const by = personOf(deps, request);
    const stranger: Frame = { base: deps.base, desk: 'Tallypost', by: null };
    const route = `${request.method} ${request.path}`;
    if (request.method === 'POST' && !isOwnPost(deps, request)) {
      return problem(
        stranger,
        403,
        'Not from this page',
        'The request came from another page, or does not say from where. Nothing was changed.',
      );
    }
    if (route === 'GET /enter') return openDoor(deps, stranger, request);
    if (route === 'POST /enter') return enter(deps, stranger, request);
    // Nothing is read from the store for somebody who is not known.
    if (by === null) {
      return problem(
        stranger,
        401,
        'No way in',
        'Ask for a link: tallypost settle or tallypost link prints one, or whoever runs this desk can make one.',
      );
    }
    const bench = await deps.openBench();
    const frame: Frame = { base: deps.base, desk: bench.desk.name, by };
    const visit = { deps, frame, bench, by, nowMs: deps.world.nowMs() };
    switch (route) {
      case 'GET /':
        return showList(visit);
      case 'GET /next':
        return goOn(visit, request.query.get('after'));
      case 'GET /message':
        return showMessage(visit, request.query.get('m') ?? '');
      case 'POST /settle':
        return settleMessage(visit, formOf(request));
      case 'POST /undo':
        return undo(visit, formOf(request));
      default:
        return problem(frame, 404, 'No such page', 'Nothing is here.');
    }
  };
}

interface Visit {
  readonly deps: SettleDeps;
  readonly frame: Frame;
  readonly bench: Bench;
  readonly by: string;
  readonly nowMs: number;
}

function personOf(deps: SettleDeps, { headers }: SettleRequest): string | null {
  const pairs = (headers.cookie ?? '').split(';').map((pair) => pair.trim().split('='));
  const value = pairs.find(([name]) => name === cookieNameOf(deps))?.[1];
  if (value === undefined) return null;
  const read = readTicket(deps.ticketKey, 'session', value, deps.world.nowMs());
  return read.kind === 'valid' ? read.ticket.by : null;
}

/** A browser says where a request comes from: by Origin, by Sec-Fetch-Site, or both. */
function isOwnPost({ origin }: SettleDeps, { headers }: SettleRequest): boolean {
  const site = headers['sec-fetch-site'];
  if (site !== undefined && site !== 'same-origin') return false;
  if (headers.origin === undefined) return site === 'same-origin';
  return headers.origin === origin;
}

async function openDoor(
  { ticketKey, world, openBench }: SettleDeps,
  stranger: Frame,
  { query }: SettleRequest,
): Promise<SettleReply> {
  const text = query.get('t') ?? '';
  const read = readTicket(ticketKey, 'enter', text, world.nowMs());
  if (read.kind === 'refused') return refusedLink(stranger, read.why);
  const { desk } = await openBench();
  return reply(200, doorPage({ ...stranger, desk: desk.name }, text, read.ticket.by));
}

async function enter(deps: SettleDeps, frame: Frame, request: SettleRequest): Promise<SettleReply> {
  const { ticketKey, world } = deps;
  const nowMs = world.nowMs();
  const read = readTicket(ticketKey, 'enter', formOf(request).get('ticket') ?? '', nowMs);
  if (read.kind === 'refused') return refusedLink(frame, read.why);
  const { by } = read.ticket;
  if (!(await isFirstUse(deps, read.ticket))) return refusedLink(frame, 'used');
  await sweepUsed(world, nowMs);
  const session = signTicket(ticketKey, {
    purpose: 'session',
    by,
    untilMs: nowMs + bounds.settleSessionMs,
    about: '',
  });
  const secure = deps.origin.startsWith('https:') ? '; Secure' : '';
  const seconds = Math.floor(bounds.settleSessionMs / 1000);
  const cookie = `${cookieNameOf(deps)}=${session}; HttpOnly; SameSite=Strict; Path=${deps.base || '/'}; Max-Age=${seconds}${secure}`;
  return {
    ...goTo(`${deps.base}/next`),
    headers: { ...goTo(`${deps.base}/next`).headers, 'set-cookie': cookie },
  };
}

/** Whether this ticket is used for the first time; it cannot be used again. */
async function isFirstUse({ world }: SettleDeps, ticket: Ticket): Promise<boolean> {
  const mark = `${usedPrefix}${usedMark(ticket)}`;
  return (await world.store.put(mark, new Uint8Array(0), { ifNoneMatch: '*' })).kind === 'written';
}

const usedPrefix = `${keys.settling}used/`;

/** Marks of tickets that are stale by now need not be kept: their tickets are refused without them. */
export async function sweepUsed({ store }: World, nowMs: number): Promise<void> {
  const stale: string[] = [];
  for await (const { key } of store.list(usedPrefix)) {
    const untilMs = Number.parseInt(key.slice(usedPrefix.length).split('-')[0] as string, 36);
    if (untilMs < nowMs) stale.push(key);
    if (stale.length >= bounds.settleSweptMax) break;
  }
  await mapBounded(stale, (key) => store.delete(key));
}

function refusedLink(frame: Frame, why: 'altered' | 'expired' | 'used'): SettleReply {
  const words = {
    altered: 'This link is not one of ours, or not whole.',
    expired: 'This link is too old.',
    used: 'This link was used before. Each works once.',
  };
  return problem(frame, 403, 'The link does not open', `${words[why]} Ask for a new one.`);
}

async function showList(visit: Visit): Promise<SettleReply> {
  const { deps, frame, bench, nowMs } = visit;
  await dropLeft(deps.world.store, nowMs, bounds.settleUndoMs, deps.onDropped);
  const all = await waitingFor(visit);
  const listed = all.slice(0, bounds.settleListedMax);
  // A large message takes memory for itself alone; of small ones many are read at a time.
  const small = listed.filter(({ bytes }) => bytes <= bounds.settleSmallBytesMax);
  const titles = new Map(await mapBounded(small, (each) => titleOf(deps, each)));
  for (const each of listed) if (!titles.has(each.message)) titles.set(...(await titleOf(deps, each)));
  const shown = listed.map((each) => ({
    ...each,
    subject: titles.get(each.message) as string,
    whyWords: whyWords(each, (queue) => titleIn(bench.desk, queue)),
  }));
  return reply(200, listPage(frame, shown, totalOf(visit, all), await lastOf(visit), nowMs));
}

/** What waits, without the one that this person has just settled. */
async function waitingFor({ deps, by }: Visit): Promise<Waiting[]> {
  const held = await heldOf(deps.world.store, by);
  return (await deps.waiting.list()).filter(({ message }) => message !== held?.message);
}

async function titleOf({ readMessage }: SettleDeps, { message }: Waiting): Promise<[string, string]> {
  return [message, messageTitle(await readMessage(keys.inbound + message), 90)];
}

function totalOf({ deps }: Visit, listed: readonly Waiting[]): number {
  return listed.length + (deps.waiting.beyond?.() ?? 0);
}

async function goOn(visit: Visit, after: string | null): Promise<SettleReply> {
  const all = await waitingFor(visit);
  const next = all[after === null ? 0 : all.findIndex(({ message }) => message === after) + 1];
  return goTo(next === undefined ? `${visit.frame.base}/` : messageHref(visit.frame, next.message));
}

async function showMessage(visit: Visit, id: string): Promise<SettleReply> {
  const { deps, frame, bench, nowMs } = visit;
  const all = await waitingFor(visit);
  const waiting = all.find(({ message }) => message === id);
  if (waiting === undefined)
    return problem(frame, 404, 'It does not wait any more', 'Somebody settled it, or it is gone.');
  const message = await deps.readMessage(keys.inbound + id);
  if (message === null) return problem(frame, 404, 'It is gone', 'The message was deleted.');
  const titleOf = (queue: string) => titleIn(bench.desk, queue);
  const token = tokenFor(visit, `settle ${id}`);
  return reply(
    200,
    messagePage(frame, {
      waiting,
      whyWords: whyWords(waiting, titleOf),
      message,
      likelihood: weighMessage(bench, message),
      total: totalOf(visit, all),
      token,
      last: await lastOf(visit),
      nowMs,
      titleOf,
    }),
  );
}

async function lastOf(visit: Visit): Promise<Last | null> {
  const { deps, bench, by } = visit;
  const confirmation = await heldOf(deps.world.store, by);
  if (confirmation === null) return null;
  const message = await deps.readMessage(keys.inbound + confirmation.message);
  return {
    confirmation,
    title: titleIn(bench.desk, confirmation.queue),
    subject: messageTitle(message, 80),
    learned: message && whatItTeaches(bench, message, confirmation.queue, Date.parse(confirmation.at)),
    token: tokenFor(visit, `undo ${confirmation.message}`),
  };
}

async function settleMessage(visit: Visit, form: URLSearchParams): Promise<SettleReply> {
  const { deps, frame, bench, by, nowMs } = visit;
  const [message, queue] = [form.get('message') ?? '', form.get('queue') ?? ''];
  const token = tokenIn(visit, form, `settle ${message}`);
  if (token === null) return stalePage(frame);
  if (!bench.desk.queues.some(({ id }) => id === queue)) {
    return problem(frame, 400, 'No such queue', 'The queue was closed meanwhile. Nothing was changed.');
  }
  const all = await waitingFor(visit);
  const at = all.findIndex((each) => each.message === message);
  if (at < 0)
    return problem(frame, 409, 'Already settled', 'Somebody settled it meanwhile. Nothing was changed.');
  if (!(await isFirstUse(deps, token))) return stalePage(frame);
  await holdSettlement(
    deps.world.store,
    { message, queue, by, at: new Date(nowMs).toISOString() },
    deps.onDropped,
  );
  const next = all[at + 1] ?? all[0];
  if (next === undefined || next.message === message) return goTo(`${frame.base}/`);
  return goTo(messageHref(frame, next.message));
}

async function undo(visit: Visit, form: URLSearchParams): Promise<SettleReply> {
  const { deps, frame, by } = visit;
  const message = form.get('message') ?? '';
  const token = tokenIn(visit, form, `undo ${message}`);
  if (token === null) return stalePage(frame);
  const held = await heldOf(deps.world.store, by);
  const taken =
    held?.message === message && (await isFirstUse(deps, token))
      ? await takeBack(deps.world.store, by)
      : null;
  if (taken === null)
    return problem(
      frame,
      409,
      'Too late to take back',
      'It was passed on already. Confirm it again with the right queue.',
    );
  return goTo(messageHref(frame, taken.message));
}

/** For one view of one message: lets this person do this with it, once. */
function tokenFor({ deps, by, nowMs }: Visit, what: string): string {
  const number = Math.floor(deps.world.random() * 2 ** 52).toString(36);
  const untilMs = nowMs + bounds.settleSessionMs;
  return signTicket(deps.ticketKey, { purpose: 'act', by, untilMs, about: `${number} ${what}` });
}

function tokenIn({ deps, by, nowMs }: Visit, form: URLSearchParams, what: string): Ticket | null {
  const read = readTicket(deps.ticketKey, 'act', form.get('token') ?? '', nowMs);
  if (read.kind === 'refused' || read.ticket.by !== by) return null;
  return read.ticket.about.slice(read.ticket.about.indexOf(' ') + 1) === what ? read.ticket : null;
}

function stalePage(frame: Frame): SettleReply {
  return problem(frame, 403, 'The page is too old', 'Open the message again. Nothing was changed.');
}

/** Everything settled so far is dropped for good: when the local server ends, for instance. */
export async function finishAll(
  deps: Pick<SettleDeps, 'world' | 'onDropped'>,
  by: string | null,
): Promise<void> {
  if (by !== null) await finishSettling(deps.world.store, by, deps.onDropped);
  else await dropLeft(deps.world.store, deps.world.nowMs(), 0, deps.onDropped);
}

function formOf({ body }: SettleRequest): URLSearchParams {
  return new URLSearchParams(Buffer.from(body).toString('utf8'));
}

function problem(frame: Frame, status: number, title: string, what: string): SettleReply {
  return reply(status, problemPage(frame, title, what));
}

const headers: Readonly<Record<string, string>> = {
  'content-type': 'text/html; charset=utf-8',
  'content-security-policy': `${strictPolicy({ style: settleStyle, script: settleScript })}; frame-ancestors 'none'`,
  'cache-control': 'no-store',
  // Not `no-referrer`: under it browsers send `Origin: null` with a form, which says no more where it comes from.
  'referrer-policy': 'same-origin',
  'x-content-type-options': 'nosniff',
  'cross-origin-opener-policy': 'same-origin',
  'cross-origin-resource-policy': 'same-origin',
};

function reply(status: number, body: string): SettleReply {
  return { status, headers, body };
}

function goTo(location: string): SettleReply {
  return { status: 303, headers: { ...headers, location }, body: '' };
}

/** What became of an error: the page says so without a customer's text. */
export function failurePage(base: string, error: unknown): SettleReply {
  const frame = { base, desk: 'Tallypost', by: null };
  if (error instanceof TallypostError)
    return problem(
      frame,
      503,
      'It does not work now',
      `${error.code} at ${error.place}: expected ${error.expected}, got ${error.got}.`,
    );
  return problem(
    frame,
    500,
    'It does not work now',
    'Something unforeseen happened. Nothing was lost: try again.',
  );
}
