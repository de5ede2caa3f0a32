import { afterEach, beforeEach, describe, expect, it } from 'vitest';
import { openDb } from '../db';
import type { Db } from '../db';
import { write } from '../write';
import { temporaryDb } from './testing';
import { countTry, giveBack, LIMITS, network } from './throttle';
import type { Subject } from './throttle';

let db: Db;
let file: string;
let close: () => Promise<void>;

beforeEach(async () => {
	({ db, file, close } = await temporaryDb());
});
afterEach(() => close());

const NOW = 1_800_000_000_000;
const MINUTE = 60_000;
const account = (whom: string): Subject => ({ limit: 'account', whom });
const address = (whom: string): Subject => ({ limit: 'address', whom });

async function times(count: number, subjects: Subject[], now = NOW) {
	const counts = [];
	for (let i = 0; i < count; i++) counts.push(await countTry(db, subjects, now));
	return counts.filter((one) => one.allowed).length;
}

describe('throttling', () => {
	it('allows ten tries for an account, then says how long to wait', async () => {
		expect(await times(10, [account('erna')])).toBe(10);
		expect(await countTry(db, [account('erna')], NOW + MINUTE)).toEqual({
			allowed: false,
			retryAfter: 14 * 60
		});
		expect(await countTry(db, [account('otto')], NOW)).toEqual({ allowed: true });
	});

	it('allows fifty tries from an address, over however many accounts', async () => {
		let allowed = 0;
		for (let i = 0; i < 100; i++) {
			const count = await countTry(db, [account(`person ${i}`), address('192.0.2.1')], NOW);
			if (count.allowed) allowed++;
		}
		expect(allowed).toBe(LIMITS.address.tries);
		expect(await times(1, [account('person 0'), address('192.0.2.2')])).toBe(1);
	});

	it('lets no more than the limit through when fifty come at once', async () => {
		const subjects = [account('erna'), address('192.0.2.1')];
		const counts = await Promise.all(Array.from({ length: 50 }, () => countTry(db, subjects, NOW)));
		expect(counts.filter((one) => one.allowed)).toHaveLength(10);
	});

	it('opens again after the wait, however often somebody tried meanwhile', async () => {
		await times(10, [account('erna')]);
		expect(await times(30, [account('erna')], NOW + 14 * MINUTE)).toBe(0);
		expect(await times(11, [account('erna')], NOW + 15 * MINUTE)).toBe(10);
	});

	it('counts a refused try for nobody: a locked account locks no address', async () => {
		await times(60, [account('erna'), address('192.0.2.1')]);
		expect(await times(50, [address('192.0.2.1')])).toBe(40);
	});

	it('gives back the try that was right, and only that', async () => {
		const subjects = [account('erna'), address('192.0.2.1')];
		await times(10, subjects);
		await write(db, (trx) => giveBack(trx, subjects));
		expect(await times(5, subjects)).toBe(1);
	});

	it('is not reset by a restart', async () => {
		await times(10, [account('erna')]);
		const again = openDb(file);
		try {
			expect((await countTry(again, [account('erna')], NOW)).allowed).toBe(false);
		} finally {
			await again.destroy();
		}
	});

	it('locks nobody for long when the clock is set back', async () => {
		await times(10, [account('erna')], NOW + 365 * 24 * 60 * MINUTE);
		expect(await times(1, [account('erna')])).toBe(1);
	});

	it('keeps no address of a person, and forgets counters that ran out', async () => {
		await times(1, [account('erna@example.org')]);
		const rows = async () =>
			JSON.stringify(await db.selectFrom('sign_in_try').selectAll().execute());
		expect(await rows()).not.toContain('erna');
		await times(1, [account('otto')], NOW + 61 * MINUTE);
		expect(await db.selectFrom('sign_in_try').select('tries').execute()).toEqual([{ tries: 1 }]);
	});

	it('takes the network of an IPv6 caller as one address', () => {
		expect(network('192.0.2.7')).toBe('192.0.2.7');
		expect(network('::ffff:192.0.2.7')).toBe('192.0.2.7');
		const one = network('2001:db8:1:2:aaaa::1');
		expect(one).toBe('2001:db8:1:2::/64');
		expect(network('2001:0DB8:0001:0002::9')).toBe(one);
		expect(network('2001:db8:1:3::1')).not.toBe(one);
		expect(network('::1')).toBe('0:0:0:0::/64');
		expect(network('fe80::1%eth0')).toBe('fe80:0:0:0::/64');
	});
});
