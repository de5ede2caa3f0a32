import 'fake-indexeddb/auto';
import { afterAll, afterEach, beforeAll, describe, expect, test } from 'vitest';
import { directTransport } from '../../../tests/support/direct-transport';
import { TestLogServer } from '../../../tests/support/log-server';
import { appendEntries } from './append';
import { SyncLoop, type LoopEnv } from './loop';
import { outboxRows } from './read';
import { askSession } from './session';
import { driven, newDevice, openBuild } from './testing';
import { httpTransport, Refused, Unreachable, type Transport } from './transport';

let server: TestLogServer;
let people = 0;
const loops: SyncLoop[] = [];
beforeAll(async () => {
	server = await TestLogServer.make();
});
afterAll(() => server.close());
afterEach(() => {
	for (const loop of loops.splice(0)) loop.stop();
});

/** A busy machine is late; what is late is not what is wrong. */
const LATE = { timeout: 15_000 };
const QUIET: Partial<LoopEnv> = { visible: () => true, locks: undefined, random: () => 0 };

async function device(change: (transport: Transport) => Partial<Transport> = () => ({})) {
	const id = `01890000-0000-7000-8000-${String(++people).padStart(12, '0')}`;
	await server.addAccount(id, 'Ada', `ada${people}@example.org`);
	const store = await newDevice(id);
	const real = directTransport(server, id);
	return { store, transport: { ...real, ...change(real) } };
}

function loopOf(
	{ store, transport }: Awaited<ReturnType<typeof device>>,
	env: Partial<LoopEnv> = {}
): SyncLoop {
	const loop = new SyncLoop(store, transport, { ...QUIET, ...env });
	loops.push(loop);
	return loop;
}

describe('the loop', () => {
	test('sends what is written without being asked, and says synced only when it came back', async () => {
		let sendable = Promise.resolve();
		const ada = await device((real) => ({
			push: (...call) => sendable.then(() => real.push(...call))
		}));
		const { build, seam } = await openBuild(ada.store);
		const loop = loopOf(ada);
		expect(loop.status.synced).toBe(false);
		loop.start();
		await expect.poll(() => loop.status.synced, LATE).toBe(true);
		let send: () => void = () => undefined;
		sendable = new Promise((resolve) => (send = resolve));
		await appendEntries(ada.store, build, [driven(seam, 1)]);
		await expect.poll(() => loop.status.waiting, LATE).toBe(1);
		expect(loop.status.synced).toBe(false);
		send();
		await expect.poll(() => loop.status.synced, LATE).toBe(true);
		expect(await outboxRows(ada.store, build)).toEqual([]);
		await expect
			.poll(() => loop.status, LATE)
			.toMatchObject({ phase: 'idle', waiting: 0, acknowledgedNotBack: 0 });
	});

	test('drains by itself once a dead server is back', async () => {
		let dead = true;
		const die = <A extends unknown[], T>(call: (...args: A) => Promise<T>) => {
			return (...args: A) => (dead ? Promise.reject(new Unreachable('timeout')) : call(...args));
		};
		const ada = await device((real) => ({ builds: die(real.builds), push: die(real.push) }));
		await openBuild(ada.store);
		const loop = loopOf(ada);
		loop.start();
		await expect.poll(() => loop.status.phase, LATE).toBe('offline');
		// The reason and the next try are told with the next count, a moment after the phase.
		await expect.poll(() => loop.status.lastError?.code, LATE).toBe('server.unreachable');
		await expect.poll(() => loop.status.nextTry, LATE).toBeDefined();
		dead = false;
		await expect.poll(() => loop.status.synced, LATE).toBe(true);
		expect(loop.status.lastError).toBeUndefined();
	});

	test('says signed out and somebody else as what they are, and goes on trying', async () => {
		let refusal = new Refused(401, 'session.none');
		const ada = await device(() => ({ builds: () => Promise.reject(refusal) }));
		await openBuild(ada.store);
		const loop = loopOf(ada);
		loop.start();
		await expect.poll(() => loop.status.phase, LATE).toBe('signed_out');
		await expect.poll(() => loop.status.nextTry, LATE).toBeDefined();
		refusal = new Refused(409, 'session.other_person');
		expect((await loop.tryNow()).phase).toBe('other_person');
		await expect.poll(() => loop.status.waiting, LATE).toBeGreaterThan(0);
	});

	test('waits for another tab that holds the lock, but a visible one not for ever', async () => {
		const ada = await device();
		await openBuild(ada.store);
		let asked = 0;
		const held = {
			request: (_: string, __: unknown, work: (lock: null) => unknown) => {
				asked++;
				return Promise.resolve(work(null));
			}
		} as unknown as LoopEnv['locks'];
		let waited = 0;
		const loop = loopOf(ada, { locks: held, elapsed: () => waited });
		loop.start();
		await expect.poll(() => asked, LATE).toBeGreaterThan(1);
		expect(loop.status.lastSuccess).toBeUndefined();
		waited = 61_000;
		await expect.poll(() => loop.status.synced, LATE).toBe(true);
	});

	test('hears of the work of others by the live stream', async () => {
		let tell: (build: string) => void = () => undefined;
		const ada = await device(() => ({
			live: (listener) => {
				tell = (build) => {
					listener.message({ build, head: 1 });
				};
				return () => undefined;
			}
		}));
		const { build, seam } = await openBuild(ada.store);
		const loop = loopOf(ada);
		loop.start();
		await expect.poll(() => loop.status.synced, LATE).toBe(true);
		const other = await newDevice(ada.store.person);
		const second = loopOf({
			store: other,
			transport: { ...ada.transport, live: () => () => undefined }
		});
		second.start();
		await expect.poll(() => second.status.synced, LATE).toBe(true);
		await appendEntries(other, build, [driven(seam, 1)]);
		await second.tryNow();
		const before = loop.status.builds[0]?.cursor ?? 0;
		tell(build);
		await expect.poll(() => loop.status.builds[0]?.cursor, LATE).toBeGreaterThan(before);
	});
});

describe('over HTTP', () => {
	const PERSON = '01890000-0000-7000-8000-00000000000a';
	const BUILD = '01890000-0000-7000-8000-00000000000b';
	const answering = (status: number, body: string, type = 'application/json') =>
		httpTransport(PERSON, () =>
			Promise.resolve(new Response(body, { status, headers: { 'content-type': type } }))
		);
	const failure = (transport: Transport) =>
		transport.builds().then(
			() => 'answered',
			(error: unknown) =>
				error instanceof Refused
					? `refused ${error.status} ${error.code}`
					: error instanceof Unreachable
						? `unreachable ${error.reason}`
						: String(error)
		);
	const says = (code: string) => JSON.stringify({ code, says: 'x' });

	test.each([
		['a page of HTML', 200, '<html>', 'text/html', 'unreachable answer'],
		['HTML that calls itself JSON', 200, '<html>', 'application/json', 'unreachable answer'],
		['another shape', 200, '{"builds":1}', 'application/json', 'unreachable answer'],
		['a redirect', 302, '', 'text/html', 'unreachable answer'],
		['a 401 of a proxy', 401, '<html>', 'text/html', 'unreachable answer'],
		['a 401 with another code', 401, says('entry.role'), 'application/json', 'unreachable answer'],
		['our 401', 401, says('session.none'), 'application/json', 'refused 401 session.none'],
		['our 409', 409, says('history.differs'), 'application/json', 'refused 409 history.differs'],
		['a 502', 502, '<html>', 'text/html', 'unreachable server'],
		['our 507', 507, says('disk.full'), 'application/json', 'unreachable server'],
		['an answer', 200, '{"builds":[],"more":1}', 'application/json', 'answered']
	])('%s', async (_, status, body, type, expected) => {
		expect(await failure(answering(status, body, type))).toBe(expected);
	});

	test('every request names the person, and the link goes with the place', async () => {
		const asked: Request[] = [];
		const transport = httpTransport(PERSON, (url, init) => {
			asked.push(new Request(new URL(url as string, 'http://localhost'), init));
			return Promise.reject(new TypeError('no network'));
		});
		const place = { seq: 7, link: 'l'.repeat(43) };
		await expect(transport.pull(BUILD, place, 10)).rejects.toMatchObject({ reason: 'network' });
		expect(asked[0]?.headers.get('x-tallybar-person')).toBe(PERSON);
		expect(asked[0]?.url).toBe(
			`http://localhost/api/builds/${BUILD}/entries?after=7&limit=10&link=${place.link}`
		);
	});

	test.each([
		[
			200,
			{ person: { id: PERSON, name: 'Ada', email: 'a@example.org' } },
			{ id: PERSON, name: 'Ada' }
		],
		[401, { code: 'session.none', says: 'x' }, 'signed_out'],
		[401, { error: 'proxy' }, 'unknown'],
		[503, { code: 'request.unavailable', says: 'x' }, 'unknown'],
		[200, { person: null }, 'nobody']
	])('%i %j: who is signed in', async (status, body, expected) => {
		expect(await askSession(() => Promise.resolve(Response.json(body, { status })))).toEqual(
			expected
		);
	});
});
