/** Lines of this device the server did not take, in words. */
import { foldedSeam, oneLine } from '$lib/device/read';
import type { OutboxRow } from '$lib/device/schema';
import type { DeviceStore } from '$lib/device/store';
import { holeKey } from '$lib/logbook/fold/seam';
import { describe } from '../logbook/describe';
import type { Names } from '../logbook/names';

export interface NotAcceptedLine {
	readonly id: string;
	readonly words: string;
	readonly code: string;
	readonly state: 'refused' | 'pending' | 'discarded';
}

const STATES = ['refused', 'pending', 'discarded'] as const;

export async function notAcceptedOf(
	store: DeviceStore,
	build: string,
	rows: readonly OutboxRow[],
	names: Names
): Promise<NotAcceptedLine[]> {
	const lines: NotAcceptedLine[] = [];
	for (const { id, state: way, code } of rows) {
		const state = STATES.find((known) => known === way);
		if (state === undefined) continue;
		const line = (await oneLine(store, build, id))?.line;
		const seam = line?.envelope.seam;
		const folded = seam === undefined ? undefined : await foldedSeam(store, build, seam);
		const own: Names = {
			...names,
			holeNumber: (_, by, index) =>
				folded?.holes.find(({ key }) => key === holeKey(by, index))?.number
		};
		const where = seam === undefined ? '' : `${names.seam(seam)}: `;
		lines.push({
			id,
			state,
			code: code ?? (state === 'discarded' ? 'entry.discarded' : 'entry.malformed'),
			words: line ? `${where}${describe(line, own)}` : 'a line that cannot be read'
		});
	}
	return lines;
}
