import { mkdtempSync, readdirSync, rmSync, statSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterEach, beforeEach, expect, it } from 'vitest';
import { utf8 } from '$lib/logbook/bytes';
import { placeStatement, start } from '$lib/logbook/chain';
import {
	makeKeys,
	makeSeal,
	publicKeyText,
	readPublicKey,
	verify,
	verifySeal
} from '$lib/logbook/seal';
import { makeId } from '../../../../tests/support/people';
import { openServerKey } from './server-key';
import { isSignedBy, Seals } from './signatures';

let folder: string;
beforeEach(() => {
	folder = mkdtempSync(join(tmpdir(), 'tallybar-key-'));
});
afterEach(() => {
	rmSync(folder, { recursive: true });
});

it('is made once, for the eyes of the server only, and read from then on', () => {
	const made = openServerKey(folder);
	const read = openServerKey(folder);
	expect([read.device, read.publicKey]).toEqual([made.device, made.publicKey]);
	expect(readdirSync(folder)).toEqual(['server-key.json']);
	expect(statSync(join(folder, 'server-key.json')).mode & 0o777).toBe(0o600);
});

it('is never replaced when it cannot be read', () => {
	writeFileSync(join(folder, 'server-key.json'), '{"device":');
	expect(() => openServerKey(folder)).toThrow('restore it from a backup');
	writeFileSync(join(folder, 'server-key.json'), '{}');
	expect(() => openServerKey(folder)).toThrow('restore it from a backup');
});

it('signs what the logbook’s own functions verify', async () => {
	const key = openServerKey(folder);
	const [build, hash] = [makeId(), 'A'.repeat(43)];
	const cryptoKey = (await readPublicKey(key.publicKey)) as CryptoKey;
	expect(await verifySeal(cryptoKey, build, key.makeSeal(build, [hash]))).toBe(true);
	const place = key.signPlace(build, start(build));
	expect(await verify(cryptoKey, placeStatement(build, place), place.signature)).toBe(true);
});

it('verifies what the logbook’s own functions sign, and nothing that differs in one byte', async () => {
	const { privateKey, publicKey } = await makeKeys();
	const key = await publicKeyText(publicKey);
	const [build, device, hash] = [makeId(), makeId(), 'B'.repeat(43)];
	const seal = await makeSeal(privateKey, build, device, [hash]);
	const of = (at: string, by: string, changed = {}) =>
		new Seals(at, [{ ...seal, ...changed }], new Set([hash])).of(device, by, hash);
	expect(of(build, key)).toEqual({ seal });
	expect(of(makeId(), key)).toBe('broken');
	expect(of(build, key, { hashes: [hash, hash] })).toBe('broken');
	expect(of(build, openServerKey(folder).publicKey)).toBe('broken');
	expect(of(build, key, { device: makeId() })).toBe('missing');
	expect(isSignedBy(key, utf8('x'), seal.signature)).toBe(false);
	expect(isSignedBy('A'.repeat(87), utf8('x'), seal.signature)).toBe(false);
	expect(isSignedBy(key, utf8('x'), '')).toBe(false);
});
