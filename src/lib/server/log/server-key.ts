/**
 * The server's own device: an id and a P-256 key in `server-key.json` in the data folder, part of every backup.
 * With it the server seals what it writes and signs the place each answer ends at. Were it lost, phones could no
 * longer prove what a restored server has forgotten; so a file that cannot be read stops the start instead of being
 * replaced.
 */
import { createPrivateKey, createPublicKey, generateKeyPairSync } from 'node:crypto';
import type { KeyObject } from 'node:crypto';
import { closeSync, fsyncSync, linkSync, openSync, readFileSync, rmSync, writeSync } from 'node:fs';
import { dirname, join } from 'node:path';
import * as z from 'zod';
import { base64url, fromBase64url } from '$lib/logbook/bytes';
import { placeStatement } from '$lib/logbook/chain';
import type { Place } from '$lib/logbook/chain';
import { Id } from '$lib/logbook/scalars';
import { sealStatement } from '$lib/logbook/seal';
import type { Seal } from '$lib/logbook/seal';
import type { SignedPlace } from '$lib/logbook/wire';
import { newId } from './id';
import { signStatement } from './signatures';

const coordinate = z.string().regex(/^[A-Za-z0-9_-]{43}$/);
const KeyFile = z.object({
	device: Id,
	privateKey: z.object({
		kty: z.literal('EC'),
		crv: z.literal('P-256'),
		x: coordinate,
		y: coordinate,
		d: coordinate
	})
});

export class ServerKey {
	readonly device: string;
	/** As it stands in `device.enrolled`. */
	readonly publicKey: string;
	readonly #key: KeyObject;

	constructor(device: string, key: KeyObject) {
		this.device = device;
		this.#key = key;
		const { x = '', y = '' } = createPublicKey(key).export({ format: 'jwk' });
		const point = new Uint8Array(65);
		point[0] = 4;
		point.set(fromBase64url(x) ?? [], 1);
		point.set(fromBase64url(y) ?? [], 33);
		this.publicKey = base64url(point);
	}

	/** "This build's history up to here is this", signed. */
	signPlace(build: string, place: Place): SignedPlace {
		const { seq, link } = place;
		return { seq, link, signature: signStatement(this.#key, placeStatement(build, place)) };
	}

	makeSeal(build: string, hashes: readonly string[]): Seal {
		const statement = sealStatement(build, this.device, hashes);
		return { device: this.device, hashes, signature: signStatement(this.#key, statement) };
	}
}

/**
 * Reads the key in this folder; makes it when there is none.
 * @throws when the file is there but is no key
 */
export function openServerKey(dataDir: string): ServerKey {
	const file = join(dataDir, 'server-key.json');
	for (;;) {
		try {
			const { device, privateKey } = KeyFile.parse(JSON.parse(readFileSync(file, 'utf8')));
			return new ServerKey(device, createPrivateKey({ key: privateKey, format: 'jwk' }));
		} catch (error) {
			if (errno(error) !== 'ENOENT')
				throw new Error(`${file} is not a server key; restore it from a backup`, { cause: error });
		}
		makeKeyFile(file);
	}
}

/** Complete and on the disk before it has its name; of two processes that start at once, one makes it. */
function makeKeyFile(file: string): void {
	const { privateKey } = generateKeyPairSync('ec', { namedCurve: 'P-256' });
	const device = newId();
	const draft = `${file}.${device}`;
	const descriptor = openSync(draft, 'wx', 0o600);
	writeSync(
		descriptor,
		JSON.stringify({ device, privateKey: privateKey.export({ format: 'jwk' }) }, null, '\t')
	);
	fsyncSync(descriptor);
	closeSync(descriptor);
	try {
		linkSync(draft, file);
	} catch (error) {
		if (errno(error) !== 'EEXIST') throw error;
	} finally {
		rmSync(draft);
	}
	const folder = openSync(dirname(file), 'r');
	fsyncSync(folder);
	closeSync(folder);
}

function errno(error: unknown): unknown {
	return error instanceof Error && 'code' in error ? error.code : undefined;
}
