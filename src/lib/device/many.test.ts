import 'fake-indexeddb/auto';
import fc from 'fast-check';
import { expect, test } from 'vitest';
import { appendEntries } from './append';
import { endOutboxRows, entriesOf, outboxRowsOf } from './many';
import { driven, newDevice, openBuild } from './testing';

test('what is read or ended over a range is what was asked for, whatever lies between', async () => {
	const store = await newDevice('01890000-0000-7000-8000-0000000000aa');
	const { build, seam } = await openBuild(store);
	const lines = await appendEntries(
		store,
		build,
		Array.from({ length: 40 }, (_, i) => driven(seam, i + 1))
	);
	const there = await store.handle.run((db) => db.getAll('outbox'));
	await fc.assert(
		fc.asyncProperty(fc.shuffledSubarray(lines), fc.boolean(), async (wanted, oneIsNowhere) => {
			const keys = wanted.map(({ id, n }) => ({ id, n }));
			if (oneIsNowhere) keys.push({ id: store.newId(), n: 7 });
			await store.handle.run(async (db) => {
				const tx = db.transaction(['entries', 'outbox'], 'readwrite');
				const [entries, outbox] = [tx.objectStore('entries'), tx.objectStore('outbox')];
				const ids = keys.map(({ id }) => id);
				const expected = keys.map(({ id }) => wanted.find((line) => line.id === id)?.id);
				expect((await entriesOf(entries, build, ids)).map((row) => row?.id)).toEqual(expected);
				const rows = await outboxRowsOf(outbox, build, keys);
				expect(rows.map((row) => row?.id)).toEqual(expected);
				await endOutboxRows(outbox, build, keys);
				const left = (await outbox.getAll()).map(({ id }) => id);
				expect(left).toEqual(there.map(({ id }) => id).filter((id) => !ids.includes(id)));
				for (const row of there) void outbox.put(row);
				await tx.done;
			});
		})
	);
});
