/**
 * Heads: of all lines that speak of one hole, one plan field or one defect, the live ones that no other live one stands on.
 * One head is the state; several were written without knowing of each other. No clock and no order decides.
 */
import type { Line } from './line';

/**
 * @param claims lines that speak of the same thing, in order; a line covers another only through claims, so
 *   covering never leaks to holes or fields that one of them does not name
 * @param isStruck struck lines are no heads and cover nothing by themselves, but causes pass through them
 * @returns the heads, in order
 */
export function headsOf(claims: readonly Line[], isStruck: (id: string) => boolean): Line[] {
	const live = claims.filter((line) => !isStruck(line.id));
	if (live.length < 2) return live;
	const byId = new Map(claims.map((line) => [line.id, line]));
	const covered = new Set<string>();
	const open: Line[] = [...live];
	for (let line = open.pop(); line; line = open.pop()) {
		for (const id of line.envelope.on) {
			const below = byId.get(id);
			// A cause is written before its effect. Without this bound, nonsense could cover itself in a circle.
			if (!below || below.envelope.n >= line.envelope.n || covered.has(id)) continue;
			covered.add(id);
			open.push(below);
		}
	}
	return live.filter((line) => !covered.has(line.id));
}
