/**
 * The signatures of src/lib/logbook/seal.ts, made and checked synchronously: inside a write transaction nothing
 * may be awaited but the database. Byte for byte the same scheme; a test signs with one and verifies with the other.
 */
import { createPublicKey, sign, verify } from 'node:crypto';
import type { KeyObject } from 'node:crypto';
import { base64url, fromBase64url } from '$lib/logbook/bytes';
import { sealStatement } from '$lib/logbook/seal';
import type { Seal } from '$lib/logbook/seal';

const DSA = 'ieee-p1363';

/** Reading a key costs as much as a verification, and a push comes from a device that pushed before. */
const MOST_KEYS = 5000;
const keys = new Map<string, KeyObject | null>();

/** The key of an uncompressed point as base64url, or null when it is no point of the curve. */
function readKey(text: string): KeyObject | null {
	let key = keys.get(text);
	if (key !== undefined) return key;
	key = null;
	const bytes = fromBase64url(text);
	if (bytes?.length === 65 && bytes[0] === 4) {
		try {
			const [x, y] = [base64url(bytes.subarray(1, 33)), base64url(bytes.subarray(33))];
			key = createPublicKey({ key: { kty: 'EC', crv: 'P-256', x, y }, format: 'jwk' });
		} catch {
			// Not on the curve: nothing it signed is valid.
		}
	}
	if (keys.size >= MOST_KEYS) keys.clear();
	keys.set(text, key);
	return key;
}

export function signStatement(key: KeyObject, statement: Uint8Array): string {
	return base64url(sign('sha256', statement, { key, dsaEncoding: DSA }));
}

/** Is this the signature of this public key over this statement? False for anything that is no signature. */
export function isSignedBy(publicKey: string, statement: Uint8Array, signature: string): boolean {
	const key = readKey(publicKey);
	const bytes = fromBase64url(signature);
	if (key === null || bytes?.length !== 64) return false;
	return verify('sha256', statement, { key, dsaEncoding: DSA }, bytes);
}

type SealState = { readonly seal: Seal } | 'broken' | 'missing';

/** The seals that came with a push. Each is verified when a line first needs it, and once for each key. */
export class Seals {
	readonly #build: string;
	readonly #byHash = new Map<string, Seal[]>();
	readonly #verified = new Map<Seal, Map<string, boolean>>();

	/** @param wanted the hashes that may be asked for; a seal may name many more */
	constructor(build: string, seals: readonly Seal[], wanted: ReadonlySet<string>) {
		this.#build = build;
		for (const seal of seals) {
			for (const hash of seal.hashes) {
				if (!wanted.has(hash)) continue;
				const naming = this.#byHash.get(hash);
				if (naming) naming.push(seal);
				else this.#byHash.set(hash, [seal]);
			}
		}
	}

	/** A valid seal of this device that names this line, or why there is none. */
	of(device: string, key: string, hash: string): SealState {
		let state: SealState = 'missing';
		for (const seal of this.#byHash.get(hash) ?? []) {
			if (seal.device !== device) continue;
			if (this.#isValid(seal, key)) return { seal };
			state = 'broken';
		}
		return state;
	}

	#isValid(seal: Seal, key: string): boolean {
		let byKey = this.#verified.get(seal);
		if (!byKey) this.#verified.set(seal, (byKey = new Map<string, boolean>()));
		let valid = byKey.get(key);
		if (valid === undefined) {
			const statement = sealStatement(this.#build, seal.device, seal.hashes);
			byKey.set(key, (valid = isSignedBy(key, statement, seal.signature)));
		}
		return valid;
	}
}
