/**
 * Seals: one signature of a device over the ordered hashes of the lines in it. Authorship rests on them, not on
 * who carries the lines. ECDSA P-256 with SHA-256 (FIPS 186-5); keys never leave the device that made them.
 */
import { base64url, fromBase64url, hashText, utf8 } from './bytes';

export interface Seal {
	readonly device: string;
	/** Hashes of the sealed lines, in the order they were sealed. */
	readonly hashes: readonly string[];
	readonly signature: string;
}

const ALGORITHM = { name: 'ECDSA', namedCurve: 'P-256' } as const;
const SIGNING = { name: 'ECDSA', hash: 'SHA-256' } as const;

/** A new pair whose private half cannot be taken out of this store. */
export function makeKeys(): Promise<CryptoKeyPair> {
	return crypto.subtle.generateKey(ALGORITHM, false, ['sign', 'verify']);
}

/** The public half as it stands in `device.enrolled`: the uncompressed point as base64url. */
export async function publicKeyText(key: CryptoKey): Promise<string> {
	return base64url(new Uint8Array(await crypto.subtle.exportKey('raw', key)));
}

/** The key of a `device.enrolled` line, or undefined when the text is no point of the curve. */
export async function readPublicKey(text: string): Promise<CryptoKey | undefined> {
	const bytes = fromBase64url(text);
	if (bytes?.length !== 65) return undefined;
	try {
		return await crypto.subtle.importKey('raw', bytes, ALGORITHM, true, ['verify']);
	} catch {
		return undefined;
	}
}

/** Signs any statement; see {@link sealStatement} and `placeStatement`. @returns r and s as base64url */
export async function sign(key: CryptoKey, statement: Uint8Array<ArrayBuffer>): Promise<string> {
	return base64url(new Uint8Array(await crypto.subtle.sign(SIGNING, key, statement)));
}

/** Is this the signature of this key over this statement? False for anything that is no signature. */
export async function verify(
	key: CryptoKey,
	statement: Uint8Array<ArrayBuffer>,
	signature: string
): Promise<boolean> {
	const bytes = fromBase64url(signature);
	return bytes?.length === 64 && (await crypto.subtle.verify(SIGNING, key, bytes, statement));
}

/** What a seal signs. The build and the device stand in it, so a seal cannot be moved to another of either. */
export function sealStatement(
	build: string,
	device: string,
	hashes: readonly string[]
): Uint8Array<ArrayBuffer> {
	return utf8(`tallybar seal 1\n${build}\n${device}\n${hashes.join('\n')}`);
}

export async function makeSeal(
	key: CryptoKey,
	build: string,
	device: string,
	hashes: readonly string[]
): Promise<Seal> {
	return { device, hashes, signature: await sign(key, sealStatement(build, device, hashes)) };
}

export function verifySeal(key: CryptoKey, build: string, seal: Seal): Promise<boolean> {
	return verify(key, sealStatement(build, seal.device, seal.hashes), seal.signature);
}

/** A name for a seal: equal seals have equal names, so that a store keeps each once. */
export function sealName(seal: Seal): string {
	return hashText(`${seal.device}\n${seal.hashes.join('\n')}\n${seal.signature}`);
}
