/**
 * The bytes of an entry.
 *
 * What must hold: one value has exactly one text. Hashes, seals, links and the comparison "same id, same
 * bytes" all rest on it, on phones that never heard of each other. So the text is the canonical form of
 * RFC 8785, narrowed until nothing is left to interpret: whole numbers only, text in NFC without lone
 * surrogates, plain keys, bounded depth. Frozen: a change here orphans every hash ever made.
 */
import { sha256 } from '@noble/hashes/sha2.js';

export type Json =
	string | number | boolean | null | readonly Json[] | { readonly [key: string]: Json };

/** Deeper than any body we write; without a bound a hostile text exhausts the stack. */
const DEEPEST = 16;
/** Keeps `__proto__` and look-alikes out of every object built from an entry. */
const KEY = /^[A-Za-z0-9][A-Za-z0-9_.:-]{0,63}$/;
const ASCII = /^[\x20-\x7e]*$/;
const LONE_SURROGATE = /\p{Surrogate}/u;

/** Thrown by {@link canonicalText}: the value has no canonical text. `path` says where. */
export class NotCanonical extends Error {
	constructor(
		readonly path: string,
		readonly fault: string
	) {
		super(`${path || 'value'}: ${fault}`);
	}
}

/**
 * The one text of a value.
 * @throws NotCanonical for a fraction, a number beyond 2^53-1, text not in NFC or with a lone surrogate, an
 *   odd key, more than 16 levels, or anything JSON has no word for.
 */
export function canonicalText(value: Json): string {
	return write(value, '', 0);
}

function write(value: Json, path: string, depth: number): string {
	if (depth > DEEPEST) throw new NotCanonical(path, 'nested too deeply');
	switch (typeof value) {
		case 'string':
			checkText(value, path);
			return JSON.stringify(value);
		case 'number':
			if (!Number.isSafeInteger(value) || Object.is(value, -0))
				throw new NotCanonical(path, 'not a whole number');
			return String(value);
		case 'boolean':
			return value ? 'true' : 'false';
		case 'object':
			break;
		default:
			throw new NotCanonical(path, `a ${typeof value} cannot be written`);
	}
	if (value === null) return 'null';
	if (Array.isArray(value)) {
		const items = value as readonly Json[];
		let text = '[';
		for (let i = 0; i < items.length; i++)
			text += (i ? ',' : '') + write(items[i] as Json, `${path}[${i}]`, depth + 1);
		return text + ']';
	}
	const object = value as { readonly [key: string]: Json };
	// Array.prototype.sort without a comparator compares UTF-16 code units, which is the order of RFC 8785.
	const keys = Object.keys(object).sort();
	let text = '{';
	for (let i = 0; i < keys.length; i++) {
		const key = keys[i] as string;
		if (!KEY.test(key))
			throw new NotCanonical(path, `key ${JSON.stringify(key).slice(0, 40)} is not plain`);
		text += `${i ? ',' : ''}"${key}":${write(object[key] as Json, path ? `${path}.${key}` : key, depth + 1)}`;
	}
	return text + '}';
}

function checkText(text: string, path: string): void {
	if (ASCII.test(text)) return;
	if (LONE_SURROGATE.test(text)) throw new NotCanonical(path, 'half a character');
	if (text.normalize('NFC') !== text) throw new NotCanonical(path, 'text not in NFC');
}

/**
 * A value made fit to be written: every text trimmed, in NFC, with plain line ends and no lone surrogates; keys whose
 * value is undefined left out. For what people type; never applied to what was received.
 */
export function tidy(value: unknown): Json {
	if (typeof value === 'string')
		return value.toWellFormed().normalize('NFC').replace(/\r\n?/g, '\n').replace(/\t/g, ' ').trim();
	if (Array.isArray(value)) return value.map(tidy);
	if (value !== null && typeof value === 'object') {
		const out: Record<string, Json> = {};
		for (const [key, inner] of Object.entries(value))
			if (inner !== undefined) out[key] = tidy(inner);
		return out;
	}
	return value as Json;
}

const encoder = new TextEncoder();

/** UTF-8 bytes of a text. */
export function utf8(text: string): Uint8Array<ArrayBuffer> {
	return encoder.encode(text);
}

/** SHA-256, synchronous: it runs inside IndexedDB transactions. */
export interface Sha256 {
	/** Of a text's UTF-8 bytes, as base64url. */
	text(text: string): string;
	/** Of bytes, as 32 bytes. */
	bytes(bytes: Uint8Array): Uint8Array;
}

let hasher: Sha256 = {
	text: (text) => base64url(sha256(utf8(text))),
	bytes: sha256
};

/**
 * Where the platform has a SHA-256 of its own, it is several times faster, and much of what a server does with a line
 * is hashing it. Must give the same digests: a test compares them.
 */
export function hashWith(other: Sha256): void {
	hasher = other;
}

/** SHA-256 of a text's UTF-8 bytes, 43 characters of base64url. */
export function hashText(text: string): string {
	return hasher.text(text);
}

/** SHA-256 of bytes, as 32 bytes. */
export function hashBytes(bytes: Uint8Array): Uint8Array {
	return hasher.bytes(bytes);
}

const ALPHABET = 'ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789-_';
const REVERSE = new Int16Array(128).fill(-1);
for (let i = 0; i < ALPHABET.length; i++) REVERSE[ALPHABET.charCodeAt(i)] = i;

/** Bytes as base64url without padding (RFC 4648 section 5). */
export function base64url(bytes: Uint8Array): string {
	let out = '';
	for (let i = 0; i < bytes.length; i += 3) {
		const a = bytes[i] as number;
		const b = bytes[i + 1];
		const c = bytes[i + 2];
		out += ALPHABET.charAt(a >> 2) + ALPHABET.charAt(((a & 3) << 4) | ((b ?? 0) >> 4));
		if (b !== undefined) out += ALPHABET.charAt(((b & 15) << 2) | ((c ?? 0) >> 6));
		if (c !== undefined) out += ALPHABET.charAt(c & 63);
	}
	return out;
}

/** The bytes of a base64url text, or undefined when it is none, or not the one way to write those bytes. */
export function fromBase64url(text: string): Uint8Array<ArrayBuffer> | undefined {
	if (text.length % 4 === 1) return undefined;
	const bytes = new Uint8Array(Math.floor((text.length * 3) / 4));
	let bits = 0;
	let held = 0;
	let at = 0;
	for (let i = 0; i < text.length; i++) {
		const code = text.charCodeAt(i);
		const six = code < 128 ? (REVERSE[code] as number) : -1;
		if (six < 0) return undefined;
		bits = (bits << 6) | six;
		held += 6;
		if (held >= 8) {
			held -= 8;
			bytes[at++] = (bits >> held) & 255;
			bits &= (1 << held) - 1;
		}
	}
	return bits === 0 ? bytes : undefined;
}
