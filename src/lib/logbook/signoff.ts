/**
 * What a sign-off covers. Frozen: an inspector's signature of today is checked by a program of ten years on, so the
 * rule fits in a line: SHA-256 over `tallybar digest 1` and the hashes of the covered lines in the order of their ids.
 */
import { hashText } from './bytes';
import { compare } from './entry';
import { isKind, type Line } from './fold/line';
import { isMaterial } from './kinds';

/**
 * The ids a sign-off over these lines covers, ascending: every material line, struck or not, and every strike of one.
 * A line that arrives later and belongs here makes the sign-off stale.
 */
export function materialOf(lines: readonly Line[]): string[] {
	const material = new Set(
		lines.filter(({ envelope: { kind, v } }) => isMaterial(kind, v)).map((line) => line.id)
	);
	const strikes = lines.filter(
		(line) => isKind(line, 'entry.struck') && material.has(line.entry.body.entry)
	);
	return [...material, ...strikes.map((line) => line.id)].sort();
}

/** @param covered id and hash of each covered line */
export function digestOf(
	covered: readonly { readonly id: string; readonly hash: string }[]
): string {
	const hashes = [...covered].sort((a, b) => compare(a.id, b.id)).map(({ hash }) => hash);
	return hashText(['tallybar digest 1', ...hashes].join('\n'));
}
