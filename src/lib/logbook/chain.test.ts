import fc from 'fast-check';
import { createHash } from 'node:crypto';
import { describe, expect, it } from 'vitest';
import { BUILD, idOf } from '../../../tests/support/scribe';
import { hashText } from './bytes';
import { next, placeStatement, start, type Accepted } from './chain';
import {
	makeKeys,
	makeSeal,
	publicKeyText,
	readPublicKey,
	sealName,
	sign,
	verify,
	verifySeal
} from './seal';

const lines: Accepted[] = Array.from({ length: 12 }, (_, i) => ({
	seq: i + 1,
	received: 1_700_000_000_000 + i,
	hash: hashText(`line ${i}`)
}));
const end = (rows: readonly Accepted[]) => rows.reduce(next, start(BUILD)).link;

describe('the chain', () => {
	it('is the SHA-256 that anybody can recompute', () => {
		const first = lines[0] as Accepted;
		const bytes = Buffer.alloc(80);
		Buffer.from(start(BUILD).link, 'base64url').copy(bytes, 0);
		bytes.writeBigUInt64BE(1n, 32);
		bytes.writeBigUInt64BE(1_700_000_000_000n, 40);
		Buffer.from(first.hash, 'base64url').copy(bytes, 48);
		expect(next(start(BUILD), first).link).toBe(
			createHash('sha256').update(bytes).digest('base64url')
		);
	});

	it('starts elsewhere for another build, and takes lines only in sequence', () => {
		expect(start(idOf(5)).link).not.toBe(start(BUILD).link);
		expect(() => next(start(BUILD), lines[1] as Accepted)).toThrow(RangeError);
	});

	it('ends elsewhere when any line is changed, moved, dropped or doubled', () => {
		const renumbered = (rows: Accepted[]) => rows.map((row, i) => ({ ...row, seq: i + 1 }));
		fc.assert(
			fc.property(
				fc.nat(11),
				fc.nat(11),
				fc.constantFrom('change', 'late', 'move', 'drop', 'double'),
				(i, j, how) => {
					const rows = [...lines];
					const row = rows[i] as Accepted;
					if (how === 'change') rows[i] = { ...row, hash: hashText('other') };
					if (how === 'late') rows[i] = { ...row, received: row.received + 1 };
					if (how === 'move') {
						fc.pre(i !== j);
						rows.splice(j, 0, ...rows.splice(i, 1));
					}
					if (how === 'drop') rows.splice(i, 1);
					if (how === 'double') rows.splice(i, 0, row);
					expect(end(renumbered(rows))).not.toBe(end(lines));
				}
			)
		);
	});
});

describe('a seal', () => {
	it('verifies with the key of its device, and with nothing changed', async () => {
		const keys = await makeKeys();
		const hashes = lines.map((line) => line.hash);
		const seal = await makeSeal(keys.privateKey, BUILD, idOf(3), hashes);
		const key = (await readPublicKey(await publicKeyText(keys.publicKey))) as CryptoKey;
		expect(await verifySeal(key, BUILD, seal)).toBe(true);
		expect(await verifySeal(key, idOf(9), seal)).toBe(false);
		expect(await verifySeal(key, BUILD, { ...seal, device: idOf(4) })).toBe(false);
		expect(await verifySeal(key, BUILD, { ...seal, hashes: hashes.slice(1) })).toBe(false);
		expect(await verifySeal(key, BUILD, { ...seal, hashes: [...hashes].reverse() })).toBe(false);
		expect(await verifySeal((await makeKeys()).publicKey, BUILD, seal)).toBe(false);
		expect(await verifySeal(key, BUILD, { ...seal, signature: 'A'.repeat(86) })).toBe(false);
		expect(sealName(seal)).not.toBe(sealName({ ...seal, hashes: hashes.slice(1) }));
	});

	it('keeps the private key in its store', async () => {
		const keys = await makeKeys();
		await expect(crypto.subtle.exportKey('pkcs8', keys.privateKey)).rejects.toThrow();
	});

	it('is not mistaken for the signature of a place', async () => {
		const keys = await makeKeys();
		const place = { seq: 3, link: hashText('x') };
		const signature = await sign(keys.privateKey, placeStatement(BUILD, place));
		expect(await verify(keys.publicKey, placeStatement(BUILD, place), signature)).toBe(true);
		expect(
			await verifySeal(keys.publicKey, BUILD, { device: idOf(3), hashes: [place.link], signature })
		).toBe(false);
	});

	it('cannot be made with a key that is no point of the curve', async () => {
		expect(await readPublicKey('B'.repeat(87))).toBeUndefined();
		expect(await readPublicKey('')).toBeUndefined();
	});
});
