import { parseOptions } from '@node-rs/argon2';
import { describe, expect, it } from 'vitest';
import { COST, HashingBusyError, hashPassword, NOBODYS_HASH, verifyPassword } from './hashing';

const FORM = /^\$argon2id\$v=19\$m=19456,t=2,p=1\$/;

describe('hashing', () => {
	it('makes argon2id hashes at the cost OWASP asks for, each with its own salt', async () => {
		const [one, two] = await Promise.all([
			hashPassword('rivet by rivet'),
			hashPassword('rivet by rivet')
		]);
		expect(one).toMatch(FORM);
		expect(two).toMatch(FORM);
		expect(one).not.toBe(two);
	});

	it('checks a password of nobody at the same cost, so that both answers take as long', () => {
		const nobody = parseOptions(NOBODYS_HASH);
		expect(nobody).toMatchObject(COST);
		expect(NOBODYS_HASH).toMatch(FORM);
	});

	it('takes a pass phrase whole: not cut, not trimmed, case kept', async () => {
		const phrase = `  ${'Längs der Rippe vier Nieten, '.repeat(3)}fertig `;
		const hash = await hashPassword(phrase);
		expect(await verifyPassword(hash, phrase)).toBe(true);
		for (const other of [phrase.slice(0, -1), phrase.trim(), phrase.toLowerCase(), `${phrase}x`]) {
			expect(await verifyPassword(hash, other), JSON.stringify(other)).toBe(false);
		}
	});

	it('knows an umlaut again however the keyboard composed it', async () => {
		const hash = await hashPassword('Flügelnasenrippe'.normalize('NFD'));
		expect(await verifyPassword(hash, 'Flügelnasenrippe'.normalize('NFC'))).toBe(true);
	});

	it('turns a flood away instead of making everybody wait behind it', async () => {
		const flood = Array.from({ length: 110 }, () => verifyPassword(NOBODYS_HASH, 'guess'));
		const ends = await Promise.allSettled(flood);
		const turnedAway = ends.filter((end) => end.status === 'rejected');
		// Two at work and a hundred waiting.
		expect(turnedAway).toHaveLength(8);
		for (const { reason } of turnedAway) expect(reason).toBeInstanceOf(HashingBusyError);
		expect(await verifyPassword(NOBODYS_HASH, 'guess')).toBe(false);
	}, 60_000);
});
