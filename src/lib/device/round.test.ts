import 'fake-indexeddb/auto';
import { afterAll, beforeAll, beforeEach, describe, expect, test } from 'vitest';
import { directTransport, removeFromCrew } from '../../../tests/support/direct-transport';
import { TestLogServer } from '../../../tests/support/log-server';
import type { Entry } from '$lib/logbook/entry';
import { appendEntries } from './append';
import { exportBuild, importExport } from './exchange';
import { foldedSeam, linesWithFindings, newestLines, oneLine, outboxRows, summaries } from './read';
import { syncRound } from './round';
import { statusOfBuilds } from './loop';
import { deleteStore, unsent } from './sign-out';
import type { DeviceStore } from './store';
import { driven, newDevice, openBuild } from './testing';
import { Refused, Unreachable, type Transport } from './transport';

let server: TestLogServer;
let people = 0;

beforeAll(async () => {
	server = await TestLogServer.make();
});
afterAll(() => server.close());

interface Phone {
	readonly store: DeviceStore;
	readonly transport: Transport;
	readonly email: string;
}

async function phone(person?: { readonly id: string; readonly email: string }): Promise<Phone> {
	const id = person?.id ?? `01890000-0000-7000-8000-${String(++people).padStart(12, '0')}`;
	const email = person?.email ?? `person${people}@example.org`;
	if (!person) await server.addAccount(id, `Person ${people}`, email);
	return { store: await newDevice(id), transport: directTransport(server, id), email };
}

const another = ({ store, email }: Phone) => phone({ id: store.person, email });

const round = ({ store, transport }: Phone, options: Parameters<typeof syncRound>[2] = {}) =>
	syncRound(store, transport, options);

async function admit(owner: Phone, build: string, member: Phone, role: 'builder' | 'follower') {
	await server.admit(
		{ author: owner.store.person } as Parameters<TestLogServer['admit']>[0],
		build,
		{ email: member.email } as Parameters<TestLogServer['admit']>[2],
		role
	);
}

const texts = async ({ store }: Phone, build: string) =>
	(await newestLines(store, build, { limit: 10_000 })).map(({ text }) => text).sort();
const states = async ({ store }: Phone, build: string) =>
	(await outboxRows(store, build)).map(({ state, code }) => (code ? `${state} ${code}` : state));
const status = async ({ store }: Phone) => (await statusOfBuilds(store))[0];

describe('two phones and a server', () => {
	let ada: Phone;
	let bob: Phone;
	let build: string;
	let seam: string;
	beforeEach(async () => {
		ada = await phone();
		bob = await phone();
		({ build, seam } = await openBuild(ada.store));
		await round(ada);
		await admit(ada, build, bob, 'builder');
		await round(bob);
	});

	test('what one wrote offline is with the other, once, and nothing waits', async () => {
		await appendEntries(ada.store, build, [driven(seam, 1, 5)]);
		await appendEntries(bob.store, build, [driven(seam, 6)]);
		for (const one of [ada, bob, ada]) expect((await round(one)).outcome).toBe('done');
		expect(await texts(ada, build)).toEqual(await texts(bob, build));
		expect(await states(ada, build)).toEqual([]);
		expect(await status(ada)).toMatchObject({ synced: true, waiting: 0 });
		expect(await summaries(bob.store, build)).toEqual(await summaries(ada.store, build));
		expect(await summaries(bob.store, build)).toMatchObject([{ driven: 6 }]);
		expect(await linesWithFindings(bob.store, build)).toEqual([]);
	});

	test('a push whose answer was lost is healed by the pull after it', async () => {
		await appendEntries(ada.store, build, [driven(seam, 1)]);
		const push: Transport['push'] = async (...call) => {
			await ada.transport.push(...call);
			throw new Unreachable('network');
		};
		const report = await round({ ...ada, transport: { ...ada.transport, push } });
		expect(report.builds.get(build)?.fault?.code).toBe('server.unreachable');
		expect(await states(ada, build)).toEqual(['waiting']);
		await round(ada);
		expect(await states(ada, build)).toEqual([]);
		expect(await summaries(ada.store, build)).toMatchObject([{ driven: 1 }]);
	});

	test('each line keeps the seal of the device that wrote it', async () => {
		const [entry] = await appendEntries(ada.store, build, [driven(seam, 1)]);
		await round(ada);
		await round(bob);
		const line = await oneLine(bob.store, build, entry?.id ?? '');
		expect(line?.seal?.device).toBe(ada.store.device);
		expect(line?.seal?.hashes).toContain(line?.hash);
	});

	test('a line that was changed on the way is not taken, and a later round gets the true one', async () => {
		await appendEntries(ada.store, build, [driven(seam, 1)]);
		await round(ada);
		const pull: Transport['pull'] = async (...call) => {
			const answer = await bob.transport.pull(...call);
			return {
				...answer,
				entries: answer.entries.map((line) => ({
					...line,
					...(line.text && { text: line.text.replace('"from":1', '"from":2') })
				}))
			};
		};
		const before = await texts(bob, build);
		const report = await round({ ...bob, transport: { ...bob.transport, pull } });
		expect(report.builds.get(build)?.fault?.code).toBe('history.broken');
		expect(await texts(bob, build)).toEqual(before);
		await round(bob);
		expect(await texts(bob, build)).toEqual(await texts(ada, build));
	});

	test('a line whose seal does not hold is kept and reported', async () => {
		const [entry] = await appendEntries(ada.store, build, [driven(seam, 1)]);
		await round(ada);
		const pull: Transport['pull'] = async (...call) => {
			const answer = await bob.transport.pull(...call);
			const seals = answer.seals.map((seal) => ({ ...seal, signature: 'A'.repeat(86) }));
			return { ...answer, seals };
		};
		await round({ ...bob, transport: { ...bob.transport, pull } });
		const found = await linesWithFindings(bob.store, build);
		expect(found.map(({ id, finding }) => ({ id, finding }))).toEqual([
			{ id: entry?.id, finding: 'seal.broken' }
		]);
		expect(await summaries(bob.store, build)).toMatchObject([{ driven: 1 }]);
	});

	test('a server that cannot be reached leaves everything waiting', async () => {
		await appendEntries(ada.store, build, [driven(seam, 1)]);
		const dead = () => Promise.reject(new Unreachable('timeout'));
		const report = await round({
			...ada,
			transport: { ...ada.transport, builds: dead, pull: dead, push: dead }
		});
		expect(report).toMatchObject({ outcome: 'offline', fault: { code: 'server.unreachable' } });
		expect(report.nextDue).toBeDefined();
		expect(await states(ada, build)).toEqual(['waiting']);
	});

	test.each([
		[401, 'session.none', 'signed_out'],
		[409, 'session.other_person', 'other_person']
	])('%i %s stops the round as %s', async (code, name, outcome) => {
		await appendEntries(ada.store, build, [driven(seam, 1)]);
		const refuse = () => Promise.reject(new Refused(code, name));
		const report = await round({ ...ada, transport: { ...ada.transport, pull: refuse } });
		expect(report.outcome).toBe(outcome);
		expect(await states(ada, build)).toEqual(['waiting']);
	});

	test('a fault of one build does not stop another', async () => {
		const second = await openBuild(ada.store);
		await appendEntries(ada.store, build, [driven(seam, 1)]);
		const pull: Transport['pull'] = (of, ...rest) =>
			of === build ? Promise.reject(new Unreachable('timeout')) : ada.transport.pull(of, ...rest);
		const report = await round({ ...ada, transport: { ...ada.transport, pull } });
		expect(report.builds.get(build)?.fault?.code).toBe('server.unreachable');
		expect(report.builds.get(second.build)).toEqual({ atHead: true });
	});

	test('what a follower may not write is refused, shown, not counted, and counts once the owner takes it', async () => {
		const finn = await phone();
		await admit(ada, build, finn, 'follower');
		await round(finn);
		const [entry] = await appendEntries(finn.store, build, [driven(seam, 1, 3)]);
		await round(finn);
		expect(await states(finn, build)).toEqual(['refused entry.role']);
		await round(finn, { tryNow: true });
		expect(await states(finn, build)).toEqual(['pending entry.role']);
		expect(await summaries(finn.store, build)).toMatchObject([{ driven: 0 }]);
		expect((await newestLines(finn.store, build, { limit: 1 }))[0]).toMatchObject({
			id: entry?.id,
			excluded: true
		});
		await ada.transport.decide(build, [entry?.id ?? ''], 'accept');
		await round(finn, { tryNow: true });
		expect(await states(finn, build)).toEqual([]);
		expect(await summaries(finn.store, build)).toMatchObject([{ driven: 3 }]);
	});

	test('a copied profile is told to become another device, and nothing is lost', async () => {
		const clone = await phone({ id: ada.store.person, email: ada.email });
		// The same keys in another store: what a copied profile is.
		const meta = await ada.store.handle.run(async (db) => ({
			device: await db.get('meta', 'device'),
			keys: await db.get('meta', `keys:${ada.store.device}`)
		}));
		await clone.store.handle.run(async (db) => {
			if (meta.device) await db.put('meta', meta.device, 'device');
			if (meta.keys) await db.put('meta', meta.keys, `keys:${ada.store.device}`);
		});
		clone.store.notices.send({ parts: [], device: ada.store.device });
		await expect.poll(() => clone.store.device).toBe(ada.store.device);
		await round(ada);
		await round(clone);
		await appendEntries(ada.store, build, [driven(seam, 1)]);
		await appendEntries(clone.store, build, [driven(seam, 2)]);
		await round(ada);
		await round(clone);
		await round(ada);
		expect(clone.store.device).not.toBe(ada.store.device);
		await appendEntries(clone.store, build, [driven(seam, 3)]);
		await round(clone);
		await round(ada);
		expect(await summaries(ada.store, build)).toMatchObject([{ driven: 3 }]);
		expect(await states(clone, build)).toEqual([]);
	});

	test('a poisonous line is parked, the rest goes on, and it goes out once the server can take it', async () => {
		const lines = await appendEntries(
			ada.store,
			build,
			Array.from({ length: 20 }, (_, i) => driven(seam, i + 1))
		);
		const poison = lines[7]?.id ?? '';
		let asked = 0;
		const push: Transport['push'] = (of, request) => {
			asked++;
			return request.entries.some((text) => text.includes(`"id":"${poison}"`))
				? Promise.reject(new Unreachable('server', 500))
				: ada.transport.push(of, request);
		};
		await round({ ...ada, transport: { ...ada.transport, push } });
		expect(await states(ada, build)).toEqual(['parked request.internal']);
		expect(asked).toBeLessThan(20);
		expect(await summaries(ada.store, build)).toMatchObject([{ driven: 20 }]);
		await round(ada, { tryNow: true });
		expect(await states(ada, build)).toEqual([]);
	});

	test('a batch that is too large is halved; a server that is down is not blamed on a line', async () => {
		await appendEntries(
			ada.store,
			build,
			Array.from({ length: 9 }, (_, i) => driven(seam, i + 1))
		);
		const sick: Transport['push'] = () => Promise.reject(new Unreachable('server', 500));
		await round({ ...ada, transport: { ...ada.transport, push: sick } });
		expect(new Set(await states(ada, build))).toEqual(new Set(['waiting']));
		const push: Transport['push'] = (of, request) =>
			request.entries.length > 3
				? Promise.reject(new Unreachable('answer', 413))
				: ada.transport.push(of, request);
		await round({ ...ada, transport: { ...ada.transport, push } });
		expect(await states(ada, build)).toEqual([]);
	});

	test('removed from the crew: read-only, no longer pulled, and what was unsent is kept on both sides', async () => {
		await appendEntries(bob.store, build, [driven(seam, 2)]);
		await round(bob);
		const [entry] = await appendEntries(bob.store, build, [driven(seam, 1)]);
		await removeFromCrew(server, ada.store.person, build, bob.store.person);
		await round(bob);
		expect(await states(bob, build)).toEqual(['refused crew.removed']);
		expect(await status(bob)).toMatchObject({ removed: true, fault: { code: 'build.removed' } });
		await expect(appendEntries(bob.store, build, [driven(seam, 3)])).rejects.toMatchObject({
			code: 'build.removed'
		});
		const kept = await ada.transport.quarantine(build);
		expect(kept.map(({ id }) => id)).toEqual([entry?.id]);
	});
});

describe('a server restored from a backup', () => {
	test('gets back every line it lacks, from whoever still has it', async () => {
		const ada = await phone();
		const bob = await phone();
		const { build, seam } = await openBuild(ada.store);
		await round(ada);
		await admit(ada, build, bob, 'builder');
		await round(bob);
		await server.backUp();
		await appendEntries(ada.store, build, [driven(seam, 1), driven(seam, 2)]);
		await round(ada);
		await appendEntries(bob.store, build, [driven(seam, 3)]);
		await round(bob);
		const before = await texts(bob, build);
		await server.restore();
		// Ada's phone is gone. What she wrote survives on Bob's.
		const report = await round(bob);
		expect(report.builds.get(build)).toEqual({ atHead: true });
		expect(await status(bob)).toMatchObject({ synced: true, offeredAgain: 0 });
		const fresh = await another(ada);
		await round(fresh);
		expect(await texts(fresh, build)).toEqual(before);
		expect(await summaries(fresh.store, build)).toMatchObject([{ driven: 3 }]);
		await round(ada);
		expect(await status(ada)).toMatchObject({ synced: true });
		expect(await texts(ada, build)).toEqual(before);
	});

	test('to before the build began, it begins again with its opening and its crew', async () => {
		await server.backUp();
		const ada = await phone();
		const bob = await phone();
		const { build, seam } = await openBuild(ada.store);
		await round(ada);
		await admit(ada, build, bob, 'builder');
		await round(bob);
		await appendEntries(bob.store, build, [driven(seam, 3)]);
		await round(bob);
		const before = await texts(bob, build);
		await server.restore();
		for (const one of [ada, bob]) await server.addAccount(one.store.person, 'Somebody', one.email);
		await round(bob);
		await round(bob);
		expect(await status(bob)).toMatchObject({ synced: true });
		await round(ada);
		expect(await texts(ada, build)).toEqual(before);
		expect(await states(bob, build)).toEqual([]);
	});
});

test('thousands of lines go out in batches and come back in pages, in the same sum', async () => {
	const ada = await phone();
	const { build, seam } = await openBuild(ada.store, 1300);
	for (let from = 1; from <= 1300; from += 260)
		await appendEntries(
			ada.store,
			build,
			Array.from({ length: 260 }, (_, i) => driven(seam, from + i))
		);
	await round(ada);
	expect(await status(ada)).toMatchObject({ synced: true });
	const fresh = await another(ada);
	await round(fresh);
	expect(
		(await foldedSeam(fresh.store, build, seam)).holes.every((h) => h.state === 'driven')
	).toBe(true);
	const waypoints = await fresh.store.handle.run((db) => db.getAll('waypoints'));
	expect(waypoints.map(({ seq }) => seq)).toEqual([1000, 1306]);
}, 60_000);

describe('a line that is numbered wildly', () => {
	/** Bob, whose counter ran away after he had enrolled, drives hole 1. */
	async function wild(counter: number) {
		const ada = await phone();
		const bob = await phone();
		const { build, seam } = await openBuild(ada.store);
		await round(ada);
		await admit(ada, build, bob, 'builder');
		await round(bob);
		await appendEntries(bob.store, build, [{ kind: 'note.written', body: { text: 'hello' } }]);
		await round(bob);
		await bob.store.handle.run(async (db) => {
			const row = await db.get('builds', build);
			if (row) await db.put('builds', { ...row, maxN: counter });
		});
		const [line] = await appendEntries(bob.store, build, [driven(seam, 1)]);
		expect(line?.n).toBe(counter + 1);
		return { ada, bob, build, seam, line: line as Entry };
	}

	test('and accepted by the owner takes nobody else along, only what stands on it', async () => {
		for (const counter of [5_000_000, 2 ** 49]) {
			const { ada, bob, build, seam, line } = await wild(counter);
			await round(bob);
			expect(await ada.transport.decide(build, [line.id], 'accept')).toMatchObject([
				{ status: 'accepted' }
			]);
			await round(ada);
			await round(bob);
			for (const one of [ada, bob]) {
				const [next] = await appendEntries(one.store, build, [driven(seam, 2)]);
				expect(next?.n).toBeLessThan(100);
				await round(one);
				expect(await states(one, build)).toEqual([]);
			}
			const on = [line.id];
			const [above, after] = await appendEntries(ada.store, build, [
				{ ...driven(seam, 1), on },
				driven(seam, 3)
			]);
			expect(after?.n).toBeLessThan(100);
			expect(above?.n).toBe(line.n + 1);
		}
	}, 30_000);

	test('and comes in a file takes nobody along either', async () => {
		const { ada, bob, build, seam } = await wild(2 ** 52 - 1);
		await importExport(ada.store, (await exportBuild(bob.store, build)).text);
		const [next] = await appendEntries(ada.store, build, [driven(seam, 2)]);
		expect(next?.n).toBeLessThan(100);
		// Nor does it keep the phone whose counter it is from writing.
		await expect(appendEntries(bob.store, build, [driven(seam, 2)])).resolves.toHaveLength(1);
	});
});

describe('after the server was restored', () => {
	async function crew() {
		const ada = await phone();
		const bob = await phone();
		const { build, seam } = await openBuild(ada.store);
		await round(ada);
		await admit(ada, build, bob, 'builder');
		await round(bob);
		await appendEntries(bob.store, build, [{ kind: 'note.written', body: { text: 'hello' } }]);
		await round(bob);
		await round(ada);
		await server.backUp();
		return { ada, bob, build, seam };
	}

	test('a line it always fails on does not keep back those offered again after it', async () => {
		const { ada, bob, build, seam } = await crew();
		const six = Array.from({ length: 6 }, (_, i) => driven(seam, i + 1));
		const lines = await appendEntries(bob.store, build, six);
		await round(bob);
		await round(ada);
		await server.restore();
		const poison = `"id":"${lines[0]?.id ?? ''}"`;
		const push: Transport['push'] = (of, request) =>
			request.entries.some((text) => text.includes(poison))
				? Promise.reject(new Unreachable('server', 500))
				: ada.transport.push(of, request);
		// Bob's phone is gone; Ada's has everything.
		for (let i = 0; i < 6; i++)
			await round({ ...ada, transport: { ...ada.transport, push } }, { tryNow: true });
		const left = (await outboxRows(ada.store, build)).map(({ id, state }) => [id, state]);
		expect(left).toEqual([[lines[0]?.id, 'parked']]);
		const fresh = await another(ada);
		await round(fresh);
		expect(await summaries(fresh.store, build)).toMatchObject([{ driven: 5 }]);
	});

	test('a note that was withdrawn meanwhile does not wait for ever', async () => {
		const { ada, bob, build } = await crew();
		const text = 'names somebody';
		const [note] = await appendEntries(bob.store, build, [
			{ kind: 'note.written', body: { text } }
		]);
		// Acknowledged, and not pulled back.
		let pushed = false;
		const push: Transport['push'] = (...call) => {
			pushed = true;
			return bob.transport.push(...call);
		};
		const pull: Transport['pull'] = (...call) =>
			pushed ? Promise.reject(new Unreachable('network')) : bob.transport.pull(...call);
		await round({ ...bob, transport: { ...bob.transport, push, pull } });
		expect(await states(bob, build)).toEqual(['acknowledged']);
		await round(ada);
		await appendEntries(ada.store, build, [
			{ kind: 'entry.withdrawn', body: { entry: note?.id ?? '', ground: 'law' } }
		]);
		await round(ada);
		await server.restore();
		for (const one of [ada, ada, bob, bob]) await round(one, { tryNow: true });
		expect((await round(bob)).nextDue).toBeUndefined();
		expect(await states(bob, build)).toEqual([]);
	});
});

describe('over a slow connection', () => {
	test('a batch that does not get through in time is made smaller', async () => {
		const ada = await phone();
		const { build, seam } = await openBuild(ada.store, 300);
		await round(ada);
		const many = Array.from({ length: 180 }, (_, i) => driven(seam, i + 1));
		await appendEntries(ada.store, build, many);
		const sizes: number[] = [];
		const push: Transport['push'] = (of, request) => {
			sizes.push(request.entries.length);
			return request.entries.length > 30
				? Promise.reject(new Unreachable('timeout'))
				: ada.transport.push(of, request);
		};
		await round({ ...ada, transport: { ...ada.transport, push } });
		expect(await states(ada, build)).toEqual([]);
		expect(sizes.slice(0, 4)).toEqual([180, 90, 45, 22]);
	}, 30_000);

	test('a page that does not come in time is asked for smaller, and larger again later', async () => {
		const ada = await phone();
		const { build, seam } = await openBuild(ada.store, 300);
		const many = Array.from({ length: 180 }, (_, i) => driven(seam, i + 1));
		await appendEntries(ada.store, build, many);
		await round(ada);
		const fresh = await another(ada);
		const limits: number[] = [];
		let carries = 100;
		const pull: Transport['pull'] = (of, at, limit = 1000) => {
			limits.push(limit);
			return limit > carries
				? Promise.reject(new Unreachable('timeout'))
				: ada.transport.pull(of, at, limit);
		};
		const slow = { ...fresh, transport: { ...fresh.transport, pull } };
		for (let i = 0; i < 5; i++) await round(slow);
		expect(limits.slice(0, 5)).toEqual([1000, 500, 250, 125, 62]);
		expect((await newestLines(fresh.store, build)).length).toBeGreaterThan(50);
		carries = 1000;
		for (let i = 0; i < 5; i++) await round(slow);
		expect(limits.at(-1)).toBe(1000);
		expect(await texts(fresh, build)).toEqual(await texts(ada, build));
	}, 30_000);
});

test('a device that may not enrol goes on as a new one', async () => {
	const ada = await phone();
	const first = ada.store.device;
	const { build } = await openBuild(ada.store);
	const push: Transport['push'] = async (of, request) => {
		const answer = await ada.transport.push(of, request);
		const enrolment = request.entries.findIndex((text) => text.includes('"device.enrolled"'));
		return {
			...answer,
			results: answer.results.map((result, i) =>
				i === enrolment
					? { id: result.id, status: 'refused' as const, code: 'device.enrolled_before' }
					: result
			)
		};
	};
	await round({ ...ada, transport: { ...ada.transport, push } });
	expect(ada.store.device).not.toBe(first);
	expect(await ada.store.keysOf(first)).toBeDefined();
	const next = await openBuild(ada.store);
	await round(ada);
	expect(await states(ada, next.build)).toEqual([]);
	expect(build).not.toBe(next.build);
});

describe('our line, when the log has another under its id', () => {
	async function conflict(meanwhile = () => Promise.resolve()) {
		const ada = await phone();
		const bob = await phone();
		const { build, seam } = await openBuild(ada.store);
		await round(ada);
		await admit(ada, build, bob, 'builder');
		await round(bob);
		await meanwhile();
		const [mine] = await appendEntries(ada.store, build, [driven(seam, 1, 9)]);
		await appendEntries(bob.store, build, [{ ...driven(seam, 15), id: mine?.id ?? '' }]);
		await round(bob);
		await round(ada);
		return { ada, bob, build };
	}
	const ours = '"to":9';

	test('is refused, unsent, in the export, and never offered again', async () => {
		const { ada, build } = await conflict();
		expect(await states(ada, build)).toEqual(['refused entry.id_conflict']);
		expect(await unsent(ada.store)).toMatchObject({ refused: 1, total: 1 });
		expect(await deleteStore(ada.store)).toMatchObject({ deleted: false });
		const { text } = await exportBuild(ada.store, build);
		expect((JSON.parse(text) as { unsealed: string[] }).unsealed.join()).toContain(ours);
		const fresh = await another(ada);
		await importExport(fresh.store, text);
		expect(await summaries(fresh.store, build)).toMatchObject([{ driven: 1 }]);
		expect((await round(ada, { tryNow: true })).nextDue).toBeUndefined();
		expect(await states(ada, build)).toEqual(['refused entry.id_conflict']);
	});

	test('is still there after the server was restored and all was pulled once more', async () => {
		const { ada, bob, build } = await conflict(() => server.backUp());
		await server.restore();
		for (const one of [ada, bob, ada, ada]) await round(one, { tryNow: true });
		const found = await linesWithFindings(ada.store, build);
		expect(found).toMatchObject([{ finding: 'entry.id_conflict' }]);
		expect(found[0]?.conflict?.text).toContain(ours);
		expect(await unsent(ada.store)).toMatchObject({ refused: 1, total: 1 });
		expect(await summaries(bob.store, build)).toMatchObject([{ driven: 1 }]);
		expect(await status(ada)).toMatchObject({ synced: true });
	});
});
