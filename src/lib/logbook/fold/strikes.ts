/**
 * Strikes. Final: a struck line is not revived, it is written again. A strike that settles a double names the line
 * it keeps; when people settle the same double at once, each in favour of another line, the rivet must not vanish
 * between them.
 */
import { byOrder } from '../entry';
import { traits } from '../kinds';
import { isKind, type Line } from './line';

export interface Strikes {
	/** Struck line to the strikes that count against it, in order. */
	readonly struck: ReadonlyMap<string, readonly Line[]>;
	/** Strikes that strike nothing here, or something that cannot be struck. */
	readonly idle: readonly Line[];
	/** Strikes in favour of a line that is itself struck: what was kept is gone. */
	readonly hollow: readonly Line[];
}

/** @param lines in order */
export function strikesOf(lines: readonly Line[]): Strikes {
	const byId = new Map(lines.map((line) => [line.id, line]));
	const against = new Map<string, Line[]>();
	const idle: Line[] = [];
	for (const line of lines) {
		if (!isKind(line, 'entry.struck')) continue;
		const target = byId.get(line.entry.body.entry);
		const { kind, v } = target?.envelope ?? { kind: '', v: 0 };
		if (!target || target.envelope.n >= line.envelope.n || !traits(kind, v)?.strikable) {
			idle.push(line);
			continue;
		}
		const list = against.get(target.id);
		if (list) list.push(line);
		else against.set(target.id, [line]);
	}
	for (const survivor of survivorsOf(against, byId)) against.delete(survivor);
	const hollow = [...against.values()].flat().filter((strike) => {
		const keeps = keptBy(strike);
		return keeps !== undefined && against.has(keeps);
	});
	return { struck: against, idle, hollow };
}

function keptBy(strike: Line): string | undefined {
	return isKind(strike, 'entry.struck') ? strike.entry.body.keeps : undefined;
}

/**
 * Lines struck in each other's favour form a ring; the earliest of each ring stays, of those that nobody also struck
 * without naming one to keep. Lines that merely lead into a ring, or out of one to a live line, are struck.
 */
function survivorsOf(
	against: ReadonlyMap<string, readonly Line[]>,
	byId: ReadonlyMap<string, Line>
): string[] {
	const favours = new Map<string, string[]>();
	const plainly = new Set<string>();
	for (const [target, strikes] of against) {
		const kept = strikes.map(keptBy).filter((id) => id !== undefined && byId.has(id));
		if (kept.length < strikes.length) plainly.add(target);
		if (kept.length) favours.set(target, kept as string[]);
	}
	// Whoever favours a line that is not itself in question cannot be in a ring; take those away until none is left.
	for (let changed = true; changed;) {
		changed = false;
		for (const [target, kept] of favours) {
			if (kept.every((id) => favours.has(id))) continue;
			favours.delete(target);
			changed = true;
		}
	}
	const favouredBy = new Map<string, string[]>();
	for (const [target, kept] of favours)
		for (const id of kept) favouredBy.set(id, [...(favouredBy.get(id) ?? []), target]);
	const survivors: string[] = [];
	const settled = new Set<string>();
	for (const target of favours.keys()) {
		if (settled.has(target)) continue;
		// A ring is what favours lead to and never out of again; lines that merely lead into one are struck.
		const ring = reachable(target, favours);
		const back = reachable(target, favouredBy);
		if (![...ring].every((id) => back.has(id))) continue;
		for (const id of ring) settled.add(id);
		const [earliest] = [...ring]
			.filter((id) => !plainly.has(id))
			.map((id) => byId.get(id) as Line)
			.sort((a, b) => byOrder(a.envelope, b.envelope));
		if (earliest) survivors.push(earliest.id);
	}
	return survivors;
}

/** What can be reached from a line in one step or more. */
function reachable(from: string, steps: ReadonlyMap<string, readonly string[]>): Set<string> {
	const reached = new Set(steps.get(from));
	for (const id of reached) for (const onward of steps.get(id) ?? []) reached.add(onward);
	return reached;
}
