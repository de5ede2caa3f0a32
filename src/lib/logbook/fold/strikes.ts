/**
 * Strikes. Final: a struck line is not revived, it is written again. A strike that settles a double names the line
 * it keeps; when people settle the same double at once, each in favour of another line, the rivet must not vanish
 * between them.
 */
import { byOrder } from '../entry';
import { traits } from '../kinds';
import { gather } from './gather';
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
		gather(against, target.id, line);
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
	const survivors: string[] = [];
	for (const ring of components(favours)) {
		// A ring is what favours lead to and never out of again; lines that merely lead into one are struck.
		const inside = new Set(ring);
		if (!ring.every((id) => favours.get(id)?.every((kept) => inside.has(kept)))) continue;
		const [earliest] = ring
			.filter((id) => !plainly.has(id))
			.map((id) => byId.get(id) as Line)
			.sort((a, b) => byOrder(a.envelope, b.envelope));
		if (earliest) survivors.push(earliest.id);
	}
	return survivors;
}

/**
 * The strongly connected components of a graph (Tarjan 1972), among its own nodes. Without recursion: a chain of strikes
 * may be longer than the stack is deep.
 */
function components(graph: ReadonlyMap<string, readonly string[]>): string[][] {
	const found: string[][] = [];
	const order = new Map<string, number>();
	const low = new Map<string, number>();
	const open: string[] = [];
	const isOpen = new Set<string>();
	for (const root of graph.keys()) {
		if (order.has(root)) continue;
		const path: { node: string; next: number }[] = [{ node: root, next: 0 }];
		for (let step = path.at(-1); step; step = path.at(-1)) {
			const { node } = step;
			if (step.next === 0) {
				order.set(node, order.size);
				low.set(node, order.get(node) as number);
				open.push(node);
				isOpen.add(node);
			}
			const onward = graph.get(node)?.[step.next++];
			if (onward !== undefined) {
				if (!graph.has(onward)) continue;
				if (!order.has(onward)) path.push({ node: onward, next: 0 });
				else if (isOpen.has(onward)) lower(low, node, order.get(onward) as number);
				continue;
			}
			path.pop();
			const above = path.at(-1);
			if (above) lower(low, above.node, low.get(node) as number);
			if (low.get(node) !== order.get(node)) continue;
			const component = open.splice(open.lastIndexOf(node));
			for (const member of component) isOpen.delete(member);
			found.push(component);
		}
	}
	return found;
}

function lower(low: Map<string, number>, node: string, to: number): void {
	low.set(node, Math.min(low.get(node) as number, to));
}
