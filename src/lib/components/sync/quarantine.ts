/** Lines in quarantine, in words. Pure. */
import { readEntry } from '$lib/logbook/entry';
import { lineOf } from '$lib/logbook/fold/line';
import { sentence } from '$lib/logbook/refusals';
import type { PushResult, QuarantinedLine } from '$lib/logbook/wire';
import { describe } from '../logbook/describe';
import type { Names } from '../logbook/names';

export interface Waiting {
	readonly id: string;
	readonly words: string;
	readonly code: string;
	/** Names. */
	readonly carrier: string;
	readonly author?: string;
	readonly at: number;
	readonly acceptable: boolean;
}

export function waitingLine(
	{ id, text, code, carrier, at, acceptable }: QuarantinedLine,
	names: Names
): Waiting {
	const line = text === null ? undefined : lineOf(readEntry(text));
	const seam = line?.envelope.seam;
	const where = seam === undefined ? '' : `${names.seam(seam)}: `;
	return {
		id,
		words: line ? `${where}${describe(line, names)}` : 'A line that cannot be read',
		code,
		carrier: names.person(carrier),
		...(line && { author: names.person(line.envelope.author) }),
		at,
		acceptable
	};
}

/** What became of a line that was decided on. */
export function resultText({ status, code }: PushResult): string {
	switch (status) {
		case 'accepted':
			return 'Accepted. It is in the log.';
		case 'duplicate':
			return 'It was in the log already.';
		case 'discarded':
			return 'Discarded. Its author keeps it and can export it.';
		case 'held':
			return 'Accepted. The server waits for a line it refers to.';
		case 'pending':
		case 'refused':
			return code === undefined ? 'Not accepted.' : `Not accepted. ${sentence(code)}`;
	}
}
