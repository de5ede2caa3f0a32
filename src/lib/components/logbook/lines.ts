/** From lines of the store to what the logbook shows. */
import type { LoggedLine } from '$lib/device/read';
import type { Build } from '$lib/logbook/fold/build';
import type { Seam } from '$lib/logbook/fold/seam';
import type { Line } from '$lib/logbook/fold/line';
import { isKind } from '$lib/logbook/fold/line';
import { sentence } from '$lib/logbook/refusals';
import { describe } from './describe';
import { placeNames, type Names } from './names';
import { STRIKE_WORDS } from './words';

/** The names of a page of lines: from the folds of the seams they are about. */
export function namesFrom(
	from: {
		readonly seams: ReadonlyMap<string, Seam>;
		readonly build: Pick<Build, 'assemblies' | 'lines'>;
		readonly person: (id: string) => string;
	},
	/** Names of seams that are not folded here. */
	seamName: (id: string) => string | undefined = () => undefined
): Names {
	const lineAt = (id: string): Line | undefined => {
		for (const { lines } of from.seams.values()) {
			const line = lines.find((found) => found.id === id);
			if (line) return line;
		}
		return from.build.lines.find((found) => found.id === id);
	};
	const names: Names = {
		...placeNames(from, seamName),
		line: (id) => {
			const line = lineAt(id);
			// A strike of a strike would go on for ever; one step says enough.
			if (!line) return 'a line not known here';
			return isKind(line, 'entry.struck', 'entry.withdrawn')
				? 'another correction'
				: describe(line, names);
		}
	};
	return names;
}

/** Who struck a line and why: "struck by Jo, wrong holes". */
export function struckText(strikes: readonly Line[], names: Names): string {
	return strikes
		.map((strike) => {
			if (!isKind(strike, 'entry.struck')) return '';
			const { reason, note, keeps } = strike.entry.body;
			return [
				`struck by ${names.person(strike.entry.author)}`,
				STRIKE_WORDS[reason],
				keeps !== undefined && `keeps: ${names.line(keeps)}`,
				note
			]
				.filter(Boolean)
				.join(', ');
		})
		.join('; ');
}

export interface WayOfLine {
	readonly look: 'hatched' | 'grease' | 'outline';
	readonly words: string;
	/** What happened and what to do. */
	readonly says?: string;
}

/** Where a line is on its way to the server; undefined once it is in the server's log, and where it never goes there. */
export function wayOf({ outbox, seq, stays, finding }: LoggedLine): WayOfLine | undefined {
	if (finding === 'entry.id_conflict')
		return {
			look: 'grease',
			words: 'its id was used twice',
			says: 'This line is in the log. Another was written under the same id and is on this device only: it stands under “Not accepted”.'
		};
	if (finding !== undefined)
		return {
			look: 'grease',
			words: 'something is wrong with this line',
			says:
				finding === 'device.other_key'
					? 'A second key was offered for a device that already has one. The first key holds.'
					: sentence(finding)
		};
	if (stays) return undefined;
	if (!outbox)
		return seq === undefined ? { look: 'outline', words: 'only on this device' } : undefined;
	const says = outbox.code === undefined ? {} : { says: sentence(outbox.code) };
	switch (outbox.state) {
		case 'waiting':
			return { look: 'hatched', words: 'waiting', ...says };
		case 'acknowledged':
			return undefined;
		case 'held':
			return {
				look: 'hatched',
				words: 'held',
				says: 'The server has it and waits for a line it refers to.'
			};
		case 'pending':
			return { look: 'grease', words: 'not accepted yet', ...says };
		case 'refused':
			return { look: 'grease', words: 'not accepted', ...says };
		case 'discarded':
			return { look: 'grease', words: 'not taken', says: sentence('entry.discarded') };
		case 'parked':
			return {
				look: 'hatched',
				words: 'set aside',
				says: 'The server failed on this line alone. It is tried again later; the others go on.'
			};
	}
}

/** What the address asks of the logbook. */
export interface LogFilter {
	readonly seam?: string;
	readonly day?: string;
	readonly kind?: string;
}

export function filterOf(params: URLSearchParams): LogFilter {
	const [seam, day, kind] = [params.get('seam'), params.get('day'), params.get('kind')];
	return {
		...(seam && { seam }),
		...(day && { day }),
		...(kind && { kind })
	};
}

/** The address of the logbook with some of the filter changed; an empty value takes one away. */
export function hrefOf(
	base: string,
	filter: LogFilter,
	change: { [K in keyof LogFilter]: string }
): string {
	const params = new URLSearchParams();
	for (const [name, value] of Object.entries({ ...filter, ...change }))
		if (value) params.set(name, value);
	const query = params.toString();
	return query === '' ? base : `${base}?${query}`;
}

/** Groups of kinds a builder looks for. Each is one value of `?kind=`. */
export const KIND_GROUPS: readonly {
	readonly name: string;
	readonly words: string;
	readonly kinds: readonly string[];
}[] = [
	{ name: 'driven', words: 'driven', kinds: ['holes.driven'] },
	{
		name: 'defect',
		words: 'defects and fixes',
		kinds: ['defect.noted', 'defect.decided', 'defect.fixed', 'holes.drilled_out']
	},
	{ name: 'open', words: 'left open', kinds: ['holes.left_open'] },
	{
		name: 'looked',
		words: 'looked at and measured',
		kinds: ['holes.looked_at', 'reading.taken', 'strip.shot']
	},
	{
		name: 'plan',
		words: 'plan',
		kinds: [
			'assembly.planned',
			'assembly.changed',
			'assembly.closed',
			'assembly.reopened',
			'assembly.retired',
			'seam.planned',
			'seam.changed',
			'seam.retired',
			'holes.added',
			'holes.retired'
		]
	},
	{
		name: 'ready',
		words: 'getting ready',
		kinds: ['setup.made', 'prep.done', 'sealant.mixed', 'bag.opened']
	},
	{ name: 'struck', words: 'strikes', kinds: ['entry.struck', 'entry.withdrawn'] },
	{ name: 'note', words: 'notes', kinds: ['note.written', 'photo.taken', 'voice.recorded'] },
	{
		name: 'crew',
		words: 'crew and build',
		kinds: [
			'build.opened',
			'build.described',
			'crew.joined',
			'crew.role',
			'crew.left',
			'crew.bound',
			'owner.changed',
			'device.enrolled',
			'person.named'
		]
	}
];

/** Is the line asked for? The day is the one on the wall where it was written. */
export function isAskedFor({ line }: Pick<LoggedLine, 'line'>, filter: LogFilter): boolean {
	if (!line)
		return filter.seam === undefined && filter.day === undefined && filter.kind === undefined;
	const { seam, at, kind } = line.envelope;
	if (filter.seam !== undefined && seam !== filter.seam) return false;
	if (filter.day !== undefined && at.slice(0, 10) !== filter.day) return false;
	if (filter.kind === undefined) return true;
	const group = KIND_GROUPS.find(({ name }) => name === filter.kind);
	return group ? group.kinds.includes(kind) : kind === filter.kind;
}
