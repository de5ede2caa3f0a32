import 'fake-indexeddb/auto';
import { beforeAll, describe, expect, test, vi } from 'vitest';
import { EXAMPLE_CREW, EXAMPLE_OWNER } from '$lib/example/crew';
import { generateLog } from '$lib/example/generate';
import { EXAMPLE_BUILD } from '$lib/example/ids';
import { appendEntries } from './append';
import { SyncLoop } from './loop';
import {
	builds,
	crewOf,
	foldedBuild,
	foldedSeam,
	newestLines,
	outboxRows,
	saveDraft,
	summaries
} from './read';
import { lastPerson, personsHere } from './registry';
import { discardStore, ensureMade, isMade, ownLines, type MadeBuild } from './staying';
import { openStayingStore, openStore, type DeviceStore } from './store';
import { driven } from './testing';
import type { Transport } from './transport';

const ADA = '01890000-0000-7000-8000-00000000000a';

let made: MadeBuild;
beforeAll(() => {
	// The plan of the example and its first weeks: the whole year is slow to clear from a store in memory.
	const log = generateLog({
		build: EXAMPLE_BUILD,
		people: EXAMPLE_CREW,
		crewLines: true,
		entries: 500
	});
	const { build, name, entries } = log;
	const crew = EXAMPLE_CREW.map(({ id, name: called, role }) => ({
		person: id,
		name: called,
		role
	}));
	made = { build, name, crew, entries };
});

let devices = 0;
const prefixOfAnother = () => `staying ${++devices}: `;
const open = (prefix: string) => openStayingStore('example', EXAMPLE_OWNER, { prefix });
const make = () => Promise.resolve(made);
async function example(prefix = prefixOfAnother()): Promise<DeviceStore> {
	const store = await open(prefix);
	await ensureMade(store, EXAMPLE_BUILD, make);
	return store;
}
/** A seam nobody has begun. */
async function untouched(store: DeviceStore): Promise<string> {
	const last = (await summaries(store, EXAMPLE_BUILD)).findLast((one) => one.driven === 0);
	if (!last) throw new Error('all is begun');
	return last.seam;
}

describe('the example on a device', () => {
	test('is there whole, as its lines say, with the crew by name and its owner writing', async () => {
		const store = await example();
		expect(await builds(store)).toMatchObject([
			{ build: EXAMPLE_BUILD, name: 'Yarrow Two', role: 'owner', lines: made.entries.length }
		]);
		expect(await summaries(store, EXAMPLE_BUILD)).toHaveLength(130);
		expect((await foldedBuild(store, EXAMPLE_BUILD)).assemblies).toHaveLength(16);
		expect((await crewOf(store, EXAMPLE_BUILD)).map(({ name }) => name)).toContain('Jo Tamsin');
		const [seam] = await summaries(store, EXAMPLE_BUILD);
		const { lines } = await foldedSeam(store, EXAMPLE_BUILD, seam?.seam ?? '');
		expect(lines).toHaveLength(seam?.lines ?? 0);
	});

	test('says how far it is while it is made, a few seams at a time', async () => {
		const store = await open(prefixOfAnother());
		const seen: number[] = [];
		await ensureMade(store, EXAMPLE_BUILD, make, {
			onprogress: ({ seams, of }) => {
				expect(of).toBe(130);
				seen.push(seams);
			}
		});
		expect(seen).toHaveLength(27);
		expect(seen.at(-1)).toBe(130);
	});

	test('is made once: who opens it again finds what they wrote in it', async () => {
		const prefix = prefixOfAnother();
		const first = await example(prefix);
		const seam = await untouched(first);
		await appendEntries(first, EXAMPLE_BUILD, [driven(seam, 1)]);
		first.close();
		const again = await open(prefix);
		const asked = vi.fn(make);
		await ensureMade(again, EXAMPLE_BUILD, asked);
		expect(asked).not.toHaveBeenCalled();
		expect(await ownLines(again, EXAMPLE_BUILD)).toBe(1);
		const [newest] = await newestLines(again, EXAMPLE_BUILD, { limit: 1 });
		expect(newest?.line?.envelope).toMatchObject({ kind: 'holes.driven', author: EXAMPLE_OWNER });
	});

	test('closed in the middle, it is not here; the next who opens it makes it whole', async () => {
		const prefix = prefixOfAnother();
		const store = await open(prefix);
		await expect(
			ensureMade(store, EXAMPLE_BUILD, make, {
				onprogress: ({ seams }) => {
					if (seams > 60) throw new Error('the tab was closed');
				}
			})
		).rejects.toThrow('closed');
		expect(await isMade(store, EXAMPLE_BUILD)).toBe(false);
		expect(await builds(store)).toEqual([]);
		store.close();
		const again = await example(prefix);
		expect(await isMade(again, EXAMPLE_BUILD)).toBe(true);
		expect(await newestLines(again, EXAMPLE_BUILD, { limit: 10_000 })).toHaveLength(
			made.entries.length
		);
	});

	test('is not called made when lines are missing', async () => {
		const store = await open(prefixOfAnother());
		const twice = { ...made, entries: [...made.entries, made.entries[0] as never] };
		await expect(
			ensureMade(store, EXAMPLE_BUILD, () => Promise.resolve(twice))
		).rejects.toMatchObject({ code: 'device.store_lost' });
		expect(await isMade(store, EXAMPLE_BUILD)).toBe(false);
	});

	test('made anew it has nothing of what was written or typed in it', async () => {
		const store = await example();
		const seam = await untouched(store);
		const before = await foldedSeam(store, EXAMPLE_BUILD, seam);
		await appendEntries(store, EXAMPLE_BUILD, [driven(seam, 1)]);
		await saveDraft(store, 'bench', { typed: true });
		await ensureMade(store, EXAMPLE_BUILD, make, { anew: true });
		expect(await ownLines(store, EXAMPLE_BUILD)).toBe(0);
		expect(await foldedSeam(store, EXAMPLE_BUILD, seam)).toEqual(before);
		expect(await store.handle.run((db) => db.count('drafts'))).toBe(0);
		await appendEntries(store, EXAMPLE_BUILD, [driven(seam, 1)]);
		expect(await ownLines(store, EXAMPLE_BUILD)).toBe(1);
	});

	test('never leaves: nothing is put in line for a server, and no loop takes its store', async () => {
		const store = await example();
		const seam = await untouched(store);
		await appendEntries(store, EXAMPLE_BUILD, [driven(seam, 1)]);
		expect(await outboxRows(store, EXAMPLE_BUILD)).toEqual([]);
		expect(() => new SyncLoop(store, {} as Transport)).toThrow('never synced');
	});

	test('is nobody’s: not among the persons here, not among the builds of who is signed in', async () => {
		const prefix = prefixOfAnother();
		const ada = await openStore(ADA, { prefix, name: 'Ada' });
		await example(prefix);
		expect((await personsHere({ prefix })).map(({ person }) => person)).toEqual([ADA]);
		expect((await lastPerson({ prefix }))?.person).toBe(ADA);
		expect(await builds(ada)).toEqual([]);
	});

	test('left, nothing of it remains', async () => {
		const prefix = prefixOfAnother();
		const store = await example(prefix);
		const { name } = store.handle;
		await discardStore(store, EXAMPLE_BUILD);
		await vi.waitFor(async () => {
			expect((await indexedDB.databases()).map((database) => database.name)).not.toContain(name);
		});
		expect(await isMade(await open(prefix), EXAMPLE_BUILD)).toBe(false);
	});
});
