/**
 * The chain: the order in which the server accepted the lines of a build, and proof that this order was not
 * changed since. Every link depends on all before it. Phones recompute links on every pull.
 */
import { hashBytes, utf8, base64url, fromBase64url } from './bytes';

/** A place in a build's history: the last line's number and the link after it. */
export interface Place {
	readonly seq: number;
	readonly link: string;
}

/** What a link is made of, apart from the link before it. */
export interface Accepted {
	/** Per build, from 1, without gaps. */
	readonly seq: number;
	/** Server clock at acceptance, in ms since 1970. */
	readonly received: number;
	/** SHA-256 of the entry's text. */
	readonly hash: string;
}

/** The place before the first line of a build. */
export function start(build: string): Place {
	return { seq: 0, link: base64url(hashBytes(utf8(`tallybar chain 1\n${build}`))) };
}

/**
 * The place after one more line: SHA-256(previous link, seq, received, entry hash), numbers as 8 bytes big-endian.
 * @throws RangeError when the line is not the next one
 */
export function next(place: Place, line: Accepted): Place {
	if (line.seq !== place.seq + 1)
		throw new RangeError(`line ${line.seq} does not follow ${place.seq}`);
	const before = fromBase64url(place.link);
	const hash = fromBase64url(line.hash);
	if (before?.length !== 32 || hash?.length !== 32)
		throw new RangeError('a link and a hash are 32 bytes each');
	const bytes = new Uint8Array(80);
	bytes.set(before, 0);
	const view = new DataView(bytes.buffer);
	view.setBigUint64(32, BigInt(line.seq));
	view.setBigUint64(40, BigInt(line.received));
	bytes.set(hash, 48);
	return { seq: line.seq, link: base64url(hashBytes(bytes)) };
}

/** What the server signs in each answer: "this build's history up to here is this". */
export function placeStatement(build: string, place: Place): Uint8Array<ArrayBuffer> {
	return utf8(`tallybar place 1\n${build}\n${place.seq}\n${place.link}`);
}
