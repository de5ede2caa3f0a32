/** Leaving a device: what a store still holds, keeping it closed, or deleting it. */
import { deleteDB } from 'idb';
import { settled, writing, type Writing } from './counting';
import { quiet } from './handle';
import { dismissPerson } from './registry';
import { ALL_STORES, type OutboxState, type Transaction } from './schema';
import { storeName, type DeviceStore } from './store';

/** Lines that would be gone from here with the store and are not in the server's log. */
export interface Unsent {
	/** Not with the server at all: waiting, or put aside after it failed on them. */
	readonly waiting: number;
	/** On its disk, waiting there for a line they refer to. */
	readonly held: number;
	/** Refused, in quarantine, or discarded. */
	readonly refused: number;
	/** Of any author, lacking on the server since it was restored. */
	readonly offeredAgain: number;
	/** The number a person is shown, and has to confirm, before any of them is deleted. */
	readonly total: number;
}

const COUNTED_AS: Record<OutboxState, 'waiting' | 'held' | 'refused' | undefined> = {
	waiting: 'waiting',
	parked: 'waiting',
	held: 'held',
	refused: 'refused',
	pending: 'refused',
	discarded: 'refused',
	// On the server's disk; only the pull that shows it is outstanding.
	acknowledged: undefined
};

/** How many lines of this store are not in the server's log. */
export async function unsent(store: DeviceStore): Promise<Unsent> {
	return store.handle.run(async (db) => {
		const tx = db.transaction(ALL_STORES, 'readonly');
		const counts = await count(tx);
		await tx.done;
		return counts;
	});
}

async function count(tx: Writing | Transaction): Promise<Unsent> {
	const counts = { waiting: 0, held: 0, refused: 0, offeredAgain: 0 };
	const onTheWay = new Map<string, number>();
	for (const { build, state, replaced } of await tx.objectStore('outbox').getAll()) {
		if (!replaced) onTheWay.set(build, (onTheWay.get(build) ?? 0) + 1);
		const as = COUNTED_AS[state];
		if (as) counts[as]++;
	}
	for (const row of await tx.objectStore('builds').getAll()) {
		if (!row.reoffer) continue;
		const offered = onTheWay.get(row.build) ?? 0;
		counts.offeredAgain += Math.max(0, row.lines - row.cursor.seq - offered);
	}
	const { waiting, held, refused, offeredAgain } = counts;
	return { ...counts, total: waiting + held + refused + offeredAgain };
}

/** Signed out, but the store stays on the device with all it holds. Signing in again opens it as it was. */
export async function closeStore(store: DeviceStore): Promise<void> {
	await dismissPerson(store.person, 'closed', { prefix: store.prefix });
	store.close();
}

/**
 * Deletes a store when nothing in it is unsent, or when `confirmed` is exactly the number of unsent lines, as it was
 * shown to the person. Counting and deleting are one transaction: a line written by another tab in between makes the
 * number wrong and nothing is deleted.
 *
 * @returns whether it was deleted; if not, the number to be shown
 */
export async function deleteStore(
	store: DeviceStore,
	confirmed = 0
): Promise<{ readonly deleted: true } | { readonly deleted: false; readonly unsent: Unsent }> {
	const left = await store.handle.run(async (db) => {
		const tx = writing(db, ALL_STORES, 'strict');
		return settled(tx, async () => {
			const held = await count(tx);
			if (held.total !== 0 && held.total !== confirmed) return held;
			for (const name of ALL_STORES) quiet(tx.objectStore(name).clear());
			return undefined;
		});
	});
	if (left) return { deleted: false, unsent: left };
	await dismissPerson(store.person, 'gone', { prefix: store.prefix });
	store.close();
	// Empty already. Another tab may keep the empty shell open for a while; nobody waits for that.
	deleteDB(storeName(store.person, store.prefix)).catch(() => undefined);
	return { deleted: true };
}
