/** Letting go of a line of this device whose id another line has in the log. */
import { settled, writing } from './counting';
import { quiet } from './handle';
import { within } from './schema';
import type { DeviceStore } from './store';

/**
 * Deletes, for good, the line that was written here under an id that another line has in the log: the one in the log
 * stays. Nothing else is ever deleted line by line. Ours was not counted, so nothing is counted anew.
 *
 * @param hash of the line the person was shown
 * @returns false and nothing is deleted when the line under this id is not that one, or is gone already
 */
export async function letGo(
	store: DeviceStore,
	build: string,
	id: string,
	hash: string
): Promise<boolean> {
	const gone = await store.handle.run(async (db) => {
		const tx = writing(db, ['entries', 'outbox'], 'strict');
		return settled(tx, async () => {
			const row = await tx.objectStore('entries').get([build, id]);
			if (row?.conflict?.hash !== hash) return false;
			delete row.conflict;
			if (row.finding === 'entry.id_conflict') delete row.finding;
			quiet(tx.objectStore('entries').put(row));
			for (const { n, id: of, replaced } of await tx.objectStore('outbox').getAll(within(build)))
				if (of === id && replaced) quiet(tx.objectStore('outbox').delete([build, n, id]));
			return true;
		});
	});
	if (gone) store.notices.send({ build, parts: [] });
	return gone;
}
