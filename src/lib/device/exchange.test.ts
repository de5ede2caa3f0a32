import 'fake-indexeddb/auto';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { directTransport } from '../../../tests/support/direct-transport';
import { TestLogServer } from '../../../tests/support/log-server';
import { next } from '$lib/logbook/chain';
import { writeEntry, type Entry } from '$lib/logbook/entry';
import { makeSeal } from '$lib/logbook/seal';
import { appendEntries } from './append';
import { exportBuild, importExport, readExport } from './exchange';
import { foldedBuild, linesWithFindings, newestLines, outboxRows, summaries } from './read';
import { syncRound } from './round';
import { closeStore, deleteStore, unsent } from './sign-out';
import { lastPerson, personsHere } from './registry';
import { openStore, type DeviceStore } from './store';
import { driven, newDevice, openBuild } from './testing';
import type { Transport } from './transport';

interface FileText {
	lines: string[];
	seals: { device: string; hashes: string[]; signature: string }[];
	states: { id: string; state: string }[];
	seal: { signature: string };
	[key: string]: unknown;
}

let server: TestLogServer;
let people = 0;
beforeAll(async () => {
	server = await TestLogServer.make();
});
afterAll(() => server.close());

async function person(name: string) {
	const id = `01890000-0000-7000-8000-${String(++people).padStart(12, '0')}`;
	await server.addAccount(id, name, `${name}${people}@example.org`);
	const store = await newDevice(id);
	return { store, email: `${name}${people}@example.org`, transport: directTransport(server, id) };
}

const texts = async (store: DeviceStore, build: string) =>
	(await newestLines(store, build, { limit: 1000 })).map(({ text }) => text).sort();

/** Ada's build with a synced part, a line of Bob's, and lines nobody else has. */
async function handOver() {
	const ada = await person('ada');
	const bob = await person('bob');
	const { build, seam } = await openBuild(ada.store);
	await syncRound(ada.store, ada.transport);
	await server.admit(
		{ author: ada.store.person } as Parameters<TestLogServer['admit']>[0],
		build,
		{ email: bob.email } as Parameters<TestLogServer['admit']>[2],
		'builder'
	);
	await syncRound(bob.store, bob.transport);
	await appendEntries(bob.store, build, [driven(seam, 1)]);
	await syncRound(bob.store, bob.transport);
	await syncRound(ada.store, ada.transport);
	await appendEntries(ada.store, build, [driven(seam, 2), driven(seam, 3)]);
	return { ada, bob, build, seam };
}

const codeOf = (attempt: Promise<unknown>) =>
	attempt.then(
		() => 'taken',
		(error: unknown) => (error as { code?: string }).code ?? String(error)
	);

describe('an exported file', () => {
	test('is read back as it was, with what was unsent under a seal of its own', async () => {
		const { ada, build } = await handOver();
		const { name, text, lines } = await exportBuild(ada.store, build);
		expect(name).toMatch(/^Test-build-\d{4}-\d\d-\d\d\.tallybar\.json$/);
		const read = await readExport(text);
		expect(read).toMatchObject({ build, device: ada.store.device, person: ada.store.person });
		expect(read.lines).toHaveLength(lines);
		expect(read.lines.map(({ row }) => row.text).sort()).toEqual(await texts(ada.store, build));
		expect([...read.states.values()].map(({ state }) => state)).toEqual(['waiting', 'waiting']);
	});

	test('shows any single line that was dropped, doubled, moved or changed', async () => {
		const { ada, build } = await handOver();
		const whole = (await exportBuild(ada.store, build)).text;
		const { length } = (JSON.parse(whole) as FileText).lines;
		expect(length).toBeGreaterThan(8);
		const changes: ((lines: string[], i: number) => void)[] = [
			(lines, i) => lines.splice(i, 1),
			(lines, i) => lines.splice(i, 0, lines[i] ?? ''),
			(lines, i) => lines.push(...lines.splice(i, 1)),
			(lines, i) => lines.unshift(...lines.splice(i, 1)),
			(lines, i) =>
				(lines[i] = (lines[i] ?? '').replace(/"n":(\d+)/, (_, n) => `"n":${Number(n) + 1}`)),
			(lines, i) => (lines[i] = (lines[i] ?? '').replace(/"at":"2/, '"at":"1')),
			(lines, i) => (lines[i] = `${lines[i] ?? ''} `)
		];
		for (const change of changes) {
			for (let i = 0; i < length; i++) {
				const file = JSON.parse(whole) as FileText;
				const before = JSON.stringify(file.lines);
				change(file.lines, i);
				if (JSON.stringify(file.lines) === before) continue;
				expect(await codeOf(readExport(JSON.stringify(file)))).toBe('file.damaged');
			}
		}
	});

	test('shows any seal or other part that was dropped, doubled, moved or changed', async () => {
		const { ada, build } = await handOver();
		const whole = (await exportBuild(ada.store, build)).text;
		const { seals } = JSON.parse(whole) as FileText;
		expect(seals.length).toBeGreaterThan(2);
		const changes: ((file: FileText, i: number) => void)[] = [
			({ seals: all }, i) => all.splice(i, 1),
			({ seals: all }, i) => all.push(...all.slice(i, i + 1)),
			({ seals: all }, i) => all.push(...all.splice(i, 1)),
			({ seals: all }, i) => all[i]?.hashes.pop(),
			({ seals: all }, i) => Object.assign(all[i] ?? {}, { signature: 'A'.repeat(86) }),
			(file) => (file.person = ada.store.newId()),
			(file) => (file.exportedAt = '2020-01-01T00:00:00.000+00:00'),
			(file) => (file.states = []),
			(file) => (file.more = 1),
			(file) => (file.seal.signature = 'A'.repeat(86)),
			(file) => (file.seal = {} as FileText['seal'])
		];
		for (const change of changes) {
			for (let i = 0; i < seals.length; i++) {
				const file = JSON.parse(whole) as FileText;
				change(file, i);
				if (JSON.stringify(file, undefined, '\t') === whole) continue;
				expect(await codeOf(readExport(JSON.stringify(file)))).toBe('file.damaged');
			}
		}
	});

	test('of something else is not ours', async () => {
		expect(await codeOf(readExport('{"a":1}'))).toBe('file.not_ours');
		expect(await codeOf(readExport('<html>'))).toBe('file.not_ours');
	});
});

describe('importing', () => {
	test('adds what lacks, once, and the lines reach the server under their own seals', async () => {
		const { ada, bob, build } = await handOver();
		const { text } = await exportBuild(ada.store, build);
		// Ada's phone falls into the gearbox. Bob carries what she wrote.
		expect(await importExport(bob.store, text)).toMatchObject({ build, added: 2 });
		expect(await importExport(bob.store, text)).toMatchObject({ added: 0 });
		expect(await summaries(bob.store, build)).toMatchObject([{ driven: 3 }]);
		await syncRound(bob.store, bob.transport);
		expect(await outboxRows(bob.store, build)).toEqual([]);
		const again = await newDevice(ada.store.person);
		await syncRound(again, ada.transport);
		expect(await texts(again, build)).toEqual(await texts(ada.store, build));
	});

	test('makes a build known on a device of the crew, and is refused to anybody else', async () => {
		const { ada, bob, build } = await handOver();
		const { text } = await exportBuild(ada.store, build);
		const fresh = await newDevice(bob.store.person);
		await importExport(fresh, text);
		expect(await texts(fresh, build)).toEqual(await texts(ada.store, build));
		await syncRound(fresh, bob.transport);
		expect(await outboxRows(fresh, build)).toEqual([]);
		const stranger = await person('eve');
		expect(await codeOf(importExport(stranger.store, text))).toBe('file.other_build');
		expect(await texts(stranger.store, build)).toEqual([]);
	});

	test('takes nothing of a damaged file', async () => {
		const { ada, bob, build } = await handOver();
		const before = await texts(bob.store, build);
		const { text } = await exportBuild(ada.store, build);
		expect(await codeOf(importExport(bob.store, text.replace('"from\\":2', '"from\\":9')))).toBe(
			'file.damaged'
		);
		expect(await texts(bob.store, build)).toEqual(before);
	});
});

describe('a line in the name of another, sealed by the device of who forged it', () => {
	/** Puts a line by `author` among those this store has written itself. */
	async function forge(store: DeviceStore, build: string, author: string, made: Forged) {
		const n = ((await store.handle.run((db) => db.get('builds', build)))?.maxN ?? 0) + 1;
		const { device } = store;
		const at = '2026-03-14T20:15:00.000+01:00';
		const reading = writeEntry({
			id: store.newId(),
			build,
			v: 1,
			on: [],
			n,
			device,
			author,
			at,
			...made
		} as Entry);
		if (!reading.ok) throw new Error(reading.code);
		const { entry, text, hash } = reading;
		const { id, kind } = entry;
		await store.handle.run((db) =>
			db.put('entries', {
				build,
				id,
				part: entry.seam ?? '',
				n,
				kind,
				device,
				author,
				text,
				hash,
				sound: 1
			})
		);
		return { entry, text, hash };
	}
	type Forged = Pick<Entry, 'kind' | 'body'> & { readonly seam?: string };
	const holes = (seam: string): Forged => ({
		kind: 'holes.driven',
		seam,
		body: { holes: [{ from: 9, to: 20 }], method: 'driven' }
	});

	test('is not taken from a file', async () => {
		const { ada, bob, build, seam } = await handOver();
		const before = await texts(ada.store, build);
		await forge(bob.store, build, ada.store.person, holes(seam));
		const { text } = await exportBuild(bob.store, build);
		expect(await codeOf(importExport(ada.store, text))).toBe('file.damaged');
		expect(await texts(ada.store, build)).toEqual(before);
	});

	test('is not taken from a file either when it hands the build over, also by a device of its own', async () => {
		const { ada, bob, build } = await handOver();
		const over: Forged = {
			kind: 'owner.changed',
			body: { from: ada.store.person, to: bob.store.person }
		};
		await bob.store.mintDevice();
		const { publicKey } = bob.store.keys;
		const enrolment: Forged = { kind: 'device.enrolled', body: { key: publicKey } };
		await forge(bob.store, build, ada.store.person, enrolment);
		await forge(bob.store, build, ada.store.person, over);
		const { text } = await exportBuild(bob.store, build);
		expect(await codeOf(importExport(ada.store, text))).toBe('file.damaged');
		expect((await foldedBuild(ada.store, build)).crew.get(bob.store.person)).toBe('builder');
	});

	test('is kept and reported when the server has it in its log', async () => {
		const { ada, bob, build, seam } = await handOver();
		const { entry, text, hash } = await forge(bob.store, build, ada.store.person, holes(seam));
		const seal = await makeSeal(bob.store.keys.pair.privateKey, build, bob.store.device, [hash]);
		// An operator who has not got Ada's key.
		const pull: Transport['pull'] = async (...call) => {
			const answer = await ada.transport.pull(...call);
			const received = 5;
			const place = next(answer.next, { seq: answer.next.seq + 1, received, hash });
			return {
				...answer,
				entries: [...answer.entries, { seq: place.seq, received, text, seal: answer.seals.length }],
				seals: [...answer.seals, { ...seal, hashes: [...seal.hashes] }],
				next: { ...place, signature: answer.next.signature },
				head: place.seq
			};
		};
		await syncRound(ada.store, { ...ada.transport, pull });
		expect(await linesWithFindings(ada.store, build)).toMatchObject([
			{ id: entry.id, finding: 'device.other_person' }
		]);
		expect(await summaries(ada.store, build)).toMatchObject([{ driven: 15 }]);
	});
});

describe('signing out', () => {
	test('with unsent lines deletes only when told exactly how many', async () => {
		const { ada, build } = await handOver();
		expect(await unsent(ada.store)).toMatchObject({ waiting: 2, total: 2 });
		expect(await deleteStore(ada.store)).toMatchObject({ deleted: false, unsent: { total: 2 } });
		expect(await deleteStore(ada.store, 1)).toMatchObject({ deleted: false });
		expect(await outboxRows(ada.store, build)).toHaveLength(2);
		expect(await deleteStore(ada.store, 2)).toEqual({ deleted: true });
		const again = await openStore(ada.store.person, { prefix: ada.store.prefix });
		expect(await texts(again, build)).toEqual([]);
	});

	test('with everything sent deletes without asking', async () => {
		const { ada } = await handOver();
		await syncRound(ada.store, ada.transport);
		expect(await deleteStore(ada.store)).toEqual({ deleted: true });
		expect(await personsHere(ada.store)).toEqual([]);
	});

	test('keeping it closed keeps every line, and signing in opens it again', async () => {
		const { ada, build } = await handOver();
		const before = await texts(ada.store, build);
		await closeStore(ada.store);
		expect(await lastPerson(ada.store)).toBeUndefined();
		expect(await personsHere(ada.store)).toMatchObject([{ state: 'closed' }]);
		const again = await openStore(ada.store.person, { prefix: ada.store.prefix });
		expect(await texts(again, build)).toEqual(before);
		expect(await lastPerson(ada.store)).toMatchObject({ state: 'open' });
	});
});
