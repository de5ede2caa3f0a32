import { createHash } from 'node:crypto';
import { isIPv6 } from 'node:net';
import type { Db, Trx } from '../db';
import { write } from '../write';

const MINUTE = 60_000;

/** So many tries in a window that begins with the first of them. */
export const LIMITS = {
	/** Failed sign-ins for one account, whether it exists or not. */
	account: { tries: 10, window: 15 * MINUTE },
	/** Failed sign-ins from one address: one password tried over many accounts. */
	address: { tries: 50, window: 15 * MINUTE },
	/** Registrations from one address, also those that were refused. */
	register: { tries: 30, window: 60 * MINUTE },
	/** Wrong present passwords when changing it, per person: somebody sits at an open session. */
	change: { tries: 10, window: 15 * MINUTE }
} as const;

const LONGEST_WINDOW = 60 * MINUTE;

export interface Subject {
	limit: keyof typeof LIMITS;
	/** Whom it concerns: the account's e-mail key, the caller's address, the person's id. */
	whom: string;
}

export type Count = { allowed: true } | { allowed: false; retryAfter: number };

/**
 * Counts a try for each subject, or refuses it when one of them has none left; a refused try counts
 * for nobody, so that hammering neither prolongs the wait nor locks more than it must.
 *
 * Call it before the password is looked at, and give the try back (`giveBack`) when it was right: so
 * parallel tries cannot get more guesses than the limit. `retryAfter` is in whole seconds, at least 1.
 */
export function countTry(db: Db, subjects: readonly Subject[], now = Date.now()): Promise<Count> {
	return write(db, async (trx) => {
		await trx
			.deleteFrom('sign_in_try')
			.where('since', '<=', now - LONGEST_WINDOW)
			.execute();
		const keys = subjects.map(keyOf);
		const counted = await trx
			.selectFrom('sign_in_try')
			.selectAll()
			.where('key', 'in', keys)
			.execute();

		let wait = 0;
		const next = subjects.map((subject, index) => {
			const { tries, window } = LIMITS[subject.limit];
			const key = keys[index] ?? '';
			const row = counted.find((one) => one.key === key);
			// A counter of the future is a clock that was set back: it would lock for as long.
			if (row === undefined || row.since + window <= now || row.since > now) {
				return { key, since: now, tries: 1 };
			}
			if (row.tries >= tries) wait = Math.max(wait, row.since + window - now);
			return { key, since: row.since, tries: row.tries + 1 };
		});
		if (wait > 0) return { allowed: false, retryAfter: Math.ceil(wait / 1000) };

		await trx
			.insertInto('sign_in_try')
			.values(next)
			.onConflict((conflict) =>
				conflict.column('key').doUpdateSet((row) => ({
					since: row.ref('excluded.since'),
					tries: row.ref('excluded.tries')
				}))
			)
			.execute();
		return { allowed: true };
	});
}

/**
 * Takes back a try that was no wrong guess. Only this one: emptying the counter would let whoever
 * owns one account guess at others from the same address without end.
 */
export async function giveBack(trx: Trx, subjects: readonly Subject[]): Promise<void> {
	await trx
		.updateTable('sign_in_try')
		.set((row) => ({ tries: row('tries', '-', 1) }))
		.where('key', 'in', subjects.map(keyOf))
		.where('tries', '>', 0)
		.execute();
}

function keyOf({ limit, whom }: Subject): string {
	const who = limit === 'account' || limit === 'change' ? sha256(whom) : network(whom);
	return `${limit}:${who}`;
}

function sha256(text: string): string {
	return createHash('sha256').update(text).digest('base64url');
}

/**
 * What one caller can choose freely counts as one address: an IPv6 host picks any of the 2^64
 * addresses of its network. Exported for its test.
 */
export function network(address: string): string {
	const plain = address.replace(/^::ffff:(?=\d+\.)/i, '').replace(/%.*$/, '');
	if (!isIPv6(plain)) return plain;
	const [head = '', tail] = plain.toLowerCase().split('::');
	const left = head === '' ? [] : head.split(':');
	const right = tail === undefined || tail === '' ? [] : tail.split(':');
	const zeros = tail === undefined ? [] : Array<string>(8 - left.length - right.length).fill('0');
	const groups = [...left, ...zeros, ...right].slice(0, 4);
	return `${groups.map((group) => group.replace(/^0+(?=.)/, '')).join(':')}::/64`;
}
