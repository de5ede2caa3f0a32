/** Reading the logbook from the device store, a page at a time, newest first. */
import {
	foldedBuild,
	foldedSeam,
	linesOfPart,
	newestLines,
	oneLine,
	outboxRows,
	type After,
	type LoggedLine
} from '$lib/device/read';
import type { DeviceStore } from '$lib/device/store';
import { byOrder } from '$lib/logbook/entry';
import type { Build } from '$lib/logbook/fold/build';
import type { Line } from '$lib/logbook/fold/line';
import type { Seam } from '$lib/logbook/fold/seam';
import { isAskedFor, type LogFilter } from './lines';

export const PAGE_LINES = 60;
const READ_AT_ONCE = 200;

export interface LogPage {
	readonly lines: readonly LoggedLine[];
	/** Is there more behind these? */
	readonly more: boolean;
}

/** The newest lines that are asked for, at most `most` of them. */
export async function readLog(
	store: DeviceStore,
	build: string,
	filter: LogFilter,
	most: number
): Promise<LogPage> {
	if (filter.seam !== undefined) return readSeam(store, build, filter.seam, filter, most);
	const lines: LoggedLine[] = [];
	let after: After | undefined;
	for (;;) {
		const page = await newestLines(store, build, {
			limit: READ_AT_ONCE,
			...(after && { after })
		});
		for (const logged of page) {
			if (!isAskedFor(logged, filter)) continue;
			if (lines.length === most) return { lines, more: true };
			lines.push(logged);
		}
		const last = page.at(-1);
		if (page.length < READ_AT_ONCE || !last?.line) return { lines, more: false };
		after = { n: last.line.envelope.n, id: last.id };
	}
}

/** A seam is read by its own index; what is not counted stands beside it in the outbox. */
async function readSeam(
	store: DeviceStore,
	build: string,
	seam: string,
	filter: LogFilter,
	most: number
): Promise<LogPage> {
	const [counted, excluded] = await Promise.all([
		linesOfPart(store, build, seam),
		outboxRows(store, build, ['refused', 'pending', 'discarded'])
	]);
	const places = [
		...counted.map(({ id, envelope: { n, device } }) => ({ id, n, device })),
		...excluded.map(({ id, n }) => ({ id, n, device: '' }))
	].sort((a, b) => byOrder(b, a));
	const lines: LoggedLine[] = [];
	for (const { id } of places) {
		const logged = await oneLine(store, build, id);
		if (!logged || !isAskedFor(logged, filter)) continue;
		if (lines.length === most) return { lines, more: true };
		lines.push(logged);
	}
	return { lines, more: false };
}

export interface Folds {
	readonly build: Build;
	readonly seams: ReadonlyMap<string, Seam>;
	/** The strikes that count against a line. */
	readonly strikes: (line: Line) => readonly Line[] | undefined;
}

/** The folds of everything these lines are about: for numbers of holes, names, and what is struck. */
export async function foldsFor(
	store: DeviceStore,
	build: string,
	lines: readonly LoggedLine[]
): Promise<Folds> {
	const ids = new Set(lines.flatMap(({ line }) => line?.envelope.seam ?? []));
	const [log, ...seams] = await Promise.all([
		foldedBuild(store, build),
		...[...ids].map((seam) => foldedSeam(store, build, seam))
	]);
	const byId = new Map(seams.map((seam) => [seam.id, seam]));
	return {
		build: log,
		seams: byId,
		strikes: ({ id, envelope: { seam } }) =>
			(seam === undefined ? log : byId.get(seam))?.struck.get(id)
	};
}

/** Lines by the day on the wall where each was written, in the order they come. */
export function byDay(
	lines: readonly LoggedLine[]
): { readonly day: string; readonly lines: readonly LoggedLine[] }[] {
	const days: { day: string; lines: LoggedLine[] }[] = [];
	for (const logged of lines) {
		const day = logged.line?.envelope.at.slice(0, 10) ?? '';
		const last = days.at(-1);
		if (last && last.day === day) last.lines.push(logged);
		else days.push({ day, lines: [logged] });
	}
	return days;
}
