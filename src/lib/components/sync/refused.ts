/** Lines of this device the server did not take, in words. */
import { foldedSeam, oneLine } from '$lib/device/read';
import type { OutboxRow } from '$lib/device/schema';
import type { DeviceStore } from '$lib/device/store';
import { readEntry } from '$lib/logbook/entry';
import { lineOf, type Line } from '$lib/logbook/fold/line';
import { holeKey } from '$lib/logbook/fold/seam';
import { describe } from '../logbook/describe';
import type { Names } from '../logbook/names';
import { clock, dayText } from '../logbook/words';

export interface NotAcceptedLine {
	readonly id: string;
	readonly words: string;
	readonly code: string;
	readonly state: 'refused' | 'pending' | 'discarded';
	/** The log has another line under its id: this is the only copy of it. */
	readonly replaced?: {
		readonly text: string;
		readonly hash: string;
		/** The other one, in words. */
		readonly inTheLog: string;
		/** When ours was written; empty when it cannot be read. */
		readonly written: string;
	};
}

const STATES = ['refused', 'pending', 'discarded'] as const;

export async function notAcceptedOf(
	store: DeviceStore,
	build: string,
	rows: readonly OutboxRow[],
	names: Names
): Promise<NotAcceptedLine[]> {
	const lines: NotAcceptedLine[] = [];
	for (const { id, state: way, code, replaced } of rows) {
		const state = STATES.find((known) => known === way);
		if (state === undefined) continue;
		const logged = await oneLine(store, build, id);
		const ours = replaced ? logged?.conflict : undefined;
		const line = ours ? lineOf(readEntry(ours.text)) : logged?.line;
		const says = async (about: Line | undefined) =>
			about ? inWords(store, build, about, names) : 'a line that cannot be read';
		lines.push({
			id,
			state,
			code: code ?? (state === 'discarded' ? 'entry.discarded' : 'entry.malformed'),
			words: await says(line),
			...(ours && {
				replaced: {
					...ours,
					inTheLog: await says(logged?.line),
					written: line
						? `${dayText(line.envelope.at.slice(0, 10))} ${clock(line.envelope.at)}`
						: ''
				}
			})
		});
	}
	return lines;
}

/** A line with the name of its seam and the numbers of its holes. */
async function inWords(
	store: DeviceStore,
	build: string,
	line: Line,
	names: Names
): Promise<string> {
	const { seam } = line.envelope;
	const folded = seam === undefined ? undefined : await foldedSeam(store, build, seam);
	const own: Names = {
		...names,
		holeNumber: (_, by, index) =>
			folded?.holes.find(({ key }) => key === holeKey(by, index))?.number
	};
	return `${seam === undefined ? '' : `${names.seam(seam)}: `}${describe(line, own)}`;
}
