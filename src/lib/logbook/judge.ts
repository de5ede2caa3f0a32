/**
 * What becomes of a line that reaches the log: accepted, held until what it refers to has arrived, or refused with a
 * code. Pure, and the same on the server and in tests; the caller looks things up and has checked the seals.
 */
import { references, type Entry, type Envelope } from './entry';
import type { Role } from './kinds';
import { mayWrite, strikeRefusal } from './permission';
import type { RefusalCode } from './refusals';
import { traits } from './kinds';

/** How far beyond the highest known number a line may be: a store that counts wildly must not drag all others along. */
export const N_LEAP = 1_000_000;

/** What must be known of an accepted line to judge those that refer to it. */
export type Known = Pick<Envelope, 'n' | 'seam' | 'assembly' | 'kind' | 'v' | 'author'>;

export interface Log {
	/** The role of a person now, `left` for a former member, undefined for somebody who never was one. */
	role(person: string): Role | 'left' | undefined;
	find(id: string): Known | undefined;
	/** Is there a line with this id that was refused and waits for the owner, or was discarded? */
	isQuarantined(id: string): boolean;
	/** Whose device this is, if it is enrolled. */
	enrolledFor(device: string): string | undefined;
	readonly maxN: number;
}

export type Judgement =
	| { readonly verdict: 'accept' }
	| { readonly verdict: 'hold'; readonly waitsFor: string }
	| { readonly verdict: 'refuse'; readonly code: RefusalCode };

const refuse = (code: RefusalCode): Judgement => ({ verdict: 'refuse', code });

export function judge(entry: Entry, log: Log): Judgement {
	const role = log.role(entry.author);
	if (traits(entry.kind, entry.v)?.writer === 'server') return refuse('entry.server_only');
	if (role === undefined) return refuse('entry.author_unknown');

	const owner = log.enrolledFor(entry.device);
	if (owner !== undefined && owner !== entry.author) return refuse('device.other_person');
	if (owner === undefined && entry.kind !== 'device.enrolled') return refuse('device.unknown');

	if (role === 'left') return refuse('crew.removed');
	if (!mayWrite(role, entry.kind, entry.v)) return refuse('entry.role');
	if (entry.n > log.maxN + N_LEAP) return refuse('entry.n_too_far');

	const { bound, loose } = references(entry);
	let missing: string | undefined;
	for (const [ids, together] of [
		[entry.on, true],
		[bound, true],
		[loose, false]
	] as const) {
		for (const id of ids) {
			const known = log.find(id);
			if (!known) {
				if (log.isQuarantined(id)) return refuse('entry.referent_refused');
				missing ??= id;
				continue;
			}
			if (known.n >= entry.n) return refuse('entry.reference_forward');
			if (together && (known.seam !== entry.seam || known.assembly !== entry.assembly))
				return refuse('entry.reference_elsewhere');
		}
	}
	if (missing !== undefined) return { verdict: 'hold', waitsFor: missing };

	if (entry.kind === 'entry.struck') {
		const target = log.find(entry.body.entry) as Known;
		const code = strikeRefusal(entry.author, role, target);
		if (code) return refuse(code);
	}
	return { verdict: 'accept' };
}
