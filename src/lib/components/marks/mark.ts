/** Which mark a hole is drawn with, and the same in words: never a state by its drawing alone. */
import type { Hole, HoleKey, Seam } from '$lib/logbook/fold/seam';
import { isKind } from '$lib/logbook/fold/line';
import { counted } from '../frame/numbers';
import { FAULT_WORDS } from '../logbook/rivet-words';

export type Ring = 'plain' | 'replaced' | 'oversize';

export interface Mark {
	readonly state: Hole['state'];
	readonly twice: boolean;
	readonly outside: boolean;
	readonly defect: boolean;
	/** A reading outside the limits, and no defect noted yet. */
	readonly suspect: boolean;
	/** Good readings, drawn as notches. */
	readonly notches: number;
	readonly ring: Ring;
}

export function markOf(hole: Hole, ring: Ring = 'plain'): Mark {
	return {
		state: hole.state,
		twice: hole.twice,
		outside: hole.outside,
		defect: hole.defects.length > 0,
		suspect: hole.state === 'driven' && hole.bad > 0 && hole.defects.length === 0,
		notches: hole.state === 'driven' ? Math.min(hole.good, 5) : 0,
		ring
	};
}

const STATE_WORDS: Readonly<Record<Hole['state'], string>> = {
	open: 'open',
	driven: 'driven',
	left_open: 'left open',
	drilled_out: 'drilled out',
	retired: 'not in the plan any more',
	contested: 'two lines differ'
};

/** "31: driven, tipped". For screen readers and for the line that tells of a picked hole. */
export function markWords(hole: Hole, seam: Pick<Seam, 'defects'>, ring: Ring = 'plain'): string {
	const faults = seam.defects
		.filter(({ id }) => hole.defects.includes(id))
		.map(({ fault }) => FAULT_WORDS[fault]);
	return [
		STATE_WORDS[hole.state],
		hole.twice && 'logged twice',
		ring === 'replaced' && 'replaced',
		ring === 'oversize' && 'replaced, next size up',
		hole.outside && 'outside the plan',
		hole.good > 0 && counted(hole.good, 'good reading'),
		hole.bad > 0 && counted(hole.bad, 'reading outside the limits', 'readings outside the limits'),
		hole.looked && 'looked at',
		hole.override?.leaveOpen !== undefined && `planned to stay open: ${hole.override.leaveOpen}`,
		...faults.map((fault) => `defect: ${fault}`)
	]
		.filter(Boolean)
		.join(', ');
}

/** Rivets that replaced another: driven by a line that stands on a drilled-out one, or named by a fix. */
export function ringsOf(seam: Seam): ReadonlyMap<HoleKey, Ring> {
	const kinds = new Map(seam.lines.map((line) => [line.id, line]));
	const oversize = new Set<string>();
	for (const line of seam.lines)
		if (isKind(line, 'defect.fixed') && !seam.struck.has(line.id)) {
			const { action, rivet } = line.entry.body;
			if (action === 'replaced_oversize' && rivet !== undefined) oversize.add(rivet);
		}
	const rings = new Map<HoleKey, Ring>();
	for (const hole of seam.holes) {
		const [head] = hole.heads;
		if (hole.state !== 'driven' || head === undefined) continue;
		if (oversize.has(head)) rings.set(hole.key, 'oversize');
		else if (
			kinds
				.get(head)
				?.envelope.on.some((id) => kinds.get(id)?.envelope.kind === 'holes.drilled_out')
		)
			rings.set(hole.key, 'replaced');
	}
	return rings;
}
