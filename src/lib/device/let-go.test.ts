import 'fake-indexeddb/auto';
import { expect, it } from 'vitest';
import { hashText } from '$lib/logbook/bytes';
import { appendEntries } from './append';
import { letGo } from './let-go';
import { oneLine, outboxRows } from './read';
import { unsent } from './sign-out';
import { driven, newDevice, openBuild } from './testing';

const ADA = '01890000-0000-7000-8000-000000000001';

/** Ours under an id that another line has in the log, as a pull leaves it. */
async function replaced() {
	const store = await newDevice(ADA);
	const { build, seam } = await openBuild(store);
	const [mine, other] = await appendEntries(store, build, [driven(seam, 1, 9), driven(seam, 15)]);
	const id = mine?.id ?? '';
	const { text: ours, hash } = (await oneLine(store, build, id)) ?? { text: '', hash: '' };
	await store.handle.run(async (db) => {
		const row = await db.get('entries', [build, id]);
		const waiting = await db.get('outbox', [build, mine?.n ?? 0, id]);
		if (!row || !waiting) throw new Error('not written');
		const text = ours.replace('"to":9', '"to":8');
		await db.put('entries', {
			...row,
			text,
			hash: hashText(text),
			seq: 1,
			history: 1,
			finding: 'entry.id_conflict',
			conflict: { text: ours, hash }
		});
		await db.put('outbox', {
			...waiting,
			state: 'refused',
			code: 'entry.id_conflict',
			replaced: true
		});
	});
	return { store, build, id, hash, other: other?.id };
}

it('a line whose id another has in the log is let go, and nothing else with it', async () => {
	const { store, build, id, hash, other } = await replaced();
	const before = (await unsent(store)).total;
	expect(await letGo(store, build, id, hash)).toBe(true);
	const line = await oneLine(store, build, id);
	expect(line).toMatchObject({ seq: 1 });
	expect(line?.conflict).toBeUndefined();
	expect(line?.finding).toBeUndefined();
	expect(line?.text).toContain('"to":8');
	const rows = await outboxRows(store, build);
	expect(rows.map((row) => row.id)).not.toContain(id);
	expect(rows.map((row) => row.id)).toContain(other);
	expect((await unsent(store)).total).toBe(before - 1);
});

it('only the line that was shown is let go, and only where the log has another', async () => {
	const { store, build, id, other = '' } = await replaced();
	const here = (await oneLine(store, build, other))?.hash ?? '';
	expect(await letGo(store, build, id, here)).toBe(false);
	expect(await letGo(store, build, other, here)).toBe(false);
	expect((await oneLine(store, build, id))?.conflict).toBeDefined();
	expect((await oneLine(store, build, other))?.text).toContain('"from":15');
});
