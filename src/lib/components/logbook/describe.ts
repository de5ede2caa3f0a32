/** A line of the log in words. Pure; every kind has a sentence, and a line this app cannot read says so. */
import type { Entry } from '$lib/logbook/entry';
import type { Line } from '$lib/logbook/fold/line';
import type { Body } from '$lib/logbook/kinds';
import { counted } from '../frame/numbers';
import { holesText, type Names } from './names';
import {
	BASIS_WORDS,
	DECISION_WORDS,
	FAULT_WORDS,
	FIX_WORDS,
	found,
	METHOD_WORDS,
	ROLE_WORDS,
	stamped,
	STRIKE_WORDS
} from './words';

/** What the line says, without who and when: "driven 27–31". */
export function describe(line: Line, names: Names): string {
	if (line.entry) return describeEntry(line.entry, names);
	switch (line.unreadable) {
		case 'withdrawn':
			return 'withdrawn: its words were taken out, the line stays';
		case 'newer_app':
			return `written by a newer app (${line.envelope.kind} ${line.envelope.v}); update to read it`;
		default:
			return `this line cannot be read (${line.envelope.kind})`;
	}
}

function describeEntry(entry: Entry, names: Names): string {
	const holes = () => holesText(entry, names);
	switch (entry.kind) {
		case 'build.opened':
			return `build opened: ${entry.body.name}`;
		case 'build.described':
			return join(`build described (${fields(entry.body)})`, entry.body.name);
		case 'crew.joined':
			return `${names.person(entry.body.person)} joined the crew as ${ROLE_WORDS[entry.body.role]}`;
		case 'crew.role':
			return `${names.person(entry.body.person)} is ${ROLE_WORDS[entry.body.role]} from now on`;
		case 'crew.left':
			return join(`${names.person(entry.body.person)} left the crew`, entry.body.reason);
		case 'crew.bound':
			return `${names.person(entry.body.person)} is the author ${names.person(entry.body.author)} of old lines`;
		case 'owner.changed':
			return `${names.person(entry.body.from)} handed the build over to ${names.person(entry.body.to)}`;
		case 'device.enrolled':
			return join('a device joined', entry.body.name);
		case 'person.named':
			return join(`helper named: ${entry.body.name}`, entry.body.note);
		case 'assembly.planned':
			return join(
				`assembly planned: ${entry.body.name}`,
				entry.body.steps && counted(Object.keys(entry.body.steps).length, 'step')
			);
		case 'assembly.changed':
			return `${names.assembly(entry.assembly ?? '')}: plan changed (${fields(entry.body)})`;
		case 'assembly.closed':
			return join(`${names.assembly(entry.assembly ?? '')} closed`, entry.body.note);
		case 'assembly.reopened':
			return join(`${names.assembly(entry.assembly ?? '')} reopened`, entry.body.reason);
		case 'assembly.retired':
			return join(
				`${names.assembly(entry.assembly ?? '')} taken out of the plan`,
				entry.body.reason
			);
		case 'seam.planned':
			return join(
				`seam planned: ${entry.body.name}`,
				counted(entry.body.holes.count, 'hole'),
				entry.body.callout && stamped(entry.body.callout)
			);
		case 'seam.changed':
			return `plan changed (${fields(entry.body)})`;
		case 'seam.retired':
			return join('seam taken out of the plan', entry.body.reason);
		case 'holes.added': {
			const { first, count, reason } = entry.body;
			return join(
				`${counted(count, 'hole')} added: ${count === 1 ? first : `${first}–${first + count - 1}`}`,
				reason
			);
		}
		case 'holes.retired':
			return join(`${holes()} taken out of the plan`, entry.body.reason);
		case 'setup.made': {
			const { gun, pressure, set, bar, barWeight, callout, method, shooter, bucker, note } =
				entry.body;
			return join(
				'setup',
				gun && `gun ${gun}`,
				pressure && `${pressure.text} ${pressure.unit}`,
				set && `set ${set}`,
				bar && `bar ${bar}`,
				barWeight && `${barWeight.text} ${barWeight.unit}`,
				method && METHOD_WORDS[method],
				callout && stamped(callout),
				entry.body.sealing,
				shooter && `${names.person(shooter)} shoots`,
				bucker && `${names.person(bucker)} bucks`,
				note
			);
		}
		case 'prep.done': {
			const { step, primer, batch, note } = entry.body;
			return join(
				[step === 'other' ? 'prepared' : step, entry.body.holes && holes()]
					.filter(Boolean)
					.join(' '),
				primer,
				batch && `batch ${batch}`,
				note
			);
		}
		case 'sealant.mixed': {
			const { product, batch, expires, minutes, note } = entry.body;
			return join(
				`sealant mixed: ${product}`,
				batch && `batch ${batch}`,
				`${minutes} min to use`,
				expires && `expires ${expires}`,
				note
			);
		}
		case 'bag.opened': {
			const { callout, lot, source, markSeen, note } = entry.body;
			return join(
				`bag opened: ${stamped(callout)}`,
				lot && `lot ${lot}`,
				source,
				markSeen && 'head mark seen',
				note
			);
		}
		case 'strip.shot':
			return join(
				`practice strip: ${counted(entry.body.heads.length, 'head')}`,
				stamped(entry.body.callout),
				entry.body.note
			);
		case 'practice.logged':
			return join(
				`practice of ${names.person(entry.body.person)}: ${counted(entry.body.heads.length, 'head')}`,
				stamped(entry.body.callout),
				entry.body.drilledOut !== undefined && `${entry.body.drilledOut} drilled out`,
				entry.body.note
			);
		case 'practice.set':
			return join(
				`practice set for ${names.person(entry.body.person)}: ${counted(entry.body.heads, 'head')}`,
				stamped(entry.body.callout),
				entry.body.note
			);
		case 'holes.driven': {
			const { method, callout, bar, shooter, bucker, note } = entry.body;
			return join(
				method === 'not_recorded' ? `done ${holes()}` : `${METHOD_WORDS[method]} ${holes()}`,
				method === 'not_recorded' && METHOD_WORDS[method],
				callout && stamped(callout),
				bar && `bar ${bar}`,
				shooter && `${names.person(shooter)} shoots`,
				bucker && `${names.person(bucker)} bucks`,
				note
			);
		}
		case 'holes.looked_at':
			return join(`${names.person(entry.body.by)} looked at ${holes()}`, entry.body.note);
		case 'holes.left_open':
			return join(
				`left open ${holes()}`,
				entry.body.reason,
				entry.body.closedBy && `closes with ${entry.body.closedBy}`
			);
		case 'holes.drilled_out':
			return join(`drilled out ${holes()}`, entry.body.reason);
		case 'reading.taken': {
			const { what, reader, note, limits } = entry.body;
			return join(
				what.is === 'strip' ? `strip head ${what.head}` : `hole ${holes()}`,
				found(entry.body.found),
				limits && `limits: ${limits.source}`,
				reader && `read by ${names.person(reader)}`,
				note
			);
		}
		case 'defect.noted':
			return join(
				`defect ${holes()}: ${FAULT_WORDS[entry.body.fault]}`,
				entry.body.by && `seen by ${names.person(entry.body.by)}`,
				entry.body.note
			);
		case 'defect.decided':
			return join(
				`decided on ${holes()}: ${DECISION_WORDS[entry.body.decision]}`,
				decidedBy(entry.body, names),
				entry.body.note
			);
		case 'defect.fixed':
			return join(
				`about the defect at ${holes()}: ${FIX_WORDS[entry.body.action]}`,
				decidedBy(entry.body, names),
				entry.body.note
			);
		case 'step.done': {
			const { value, note } = entry.body;
			return join(
				'step done',
				value &&
					('number' in value ? [value.number, value.unit].filter(Boolean).join(' ') : value.text),
				note
			);
		}
		case 'closing.listed': {
			const no = entry.body.items.filter(({ is }) => is === 'no').length;
			return join(
				`closing list: ${counted(entry.body.items.length, 'item')}`,
				no > 0 && `${no} not yet`
			);
		}
		case 'waiver.given':
			return join(`waiver: ${entry.body.what}`, holes(), entry.body.reason);
		case 'inspection.asked':
			return join(
				'inspection asked for',
				entry.body.seams?.map((seam) => names.seam(seam)).join(', '),
				entry.body.note
			);
		case 'inspection.signed':
			return join(
				`signed by ${entry.body.name}: ${VERDICT_WORDS[entry.body.verdict]}`,
				entry.body.rework && `rework ${holes()}`,
				entry.body.remarks
			);
		case 'inspection.confirmed':
			return `sign-off confirmed by ${entry.body.means}`;
		case 'inspection.refused':
			return join('inspection refused', entry.body.reason);
		case 'note.written':
			return join(entry.body.holes ? `note on ${holes()}` : 'note', entry.body.text);
		case 'photo.taken':
			return join(entry.body.holes ? `photo of ${holes()}` : 'photo', entry.body.caption);
		case 'voice.recorded':
			return join(`voice, ${entry.body.seconds} s`, entry.body.caption);
		case 'time.worked':
			return join(
				`worked ${hours(entry.body.minutes)} on ${entry.body.day}`,
				entry.body.people.map((person) => names.person(person)).join(', '),
				entry.body.note
			);
		case 'stock.counted':
			return join(
				`${entry.body.is} ${counted(entry.body.pieces, 'piece')}`,
				stamped(entry.body.callout),
				entry.body.lot && `lot ${entry.body.lot}`,
				entry.body.note
			);
		case 'entry.withdrawn':
			return join(
				`withdrew the words of: ${names.line(entry.body.entry)}`,
				entry.body.ground === 'law' && 'required by law',
				entry.body.note
			);
		case 'entry.struck':
			return join(
				`struck: ${names.line(entry.body.entry)}`,
				STRIKE_WORDS[entry.body.reason],
				entry.body.keeps && `keeps: ${names.line(entry.body.keeps)}`,
				entry.body.note
			);
	}
}

const VERDICT_WORDS = {
	in_order: 'in order',
	in_order_with_remarks: 'in order, with remarks',
	rework: 'rework',
	not_seen: 'not seen'
} as const;

/** Names of the fields a change of plan carries, in words. */
function fields(body: Readonly<Record<string, unknown>>): string {
	return Object.keys(body)
		.map((key) => FIELD_WORDS[key] ?? key)
		.join(', ');
}

const FIELD_WORDS: Readonly<Record<string, string>> = {
	perRow: 'holes in each row',
	rowSpacing: 'row spacing',
	edge: 'edge distance',
	endOne: 'which end is 1',
	endLast: 'the other end',
	head: 'near or far side',
	people: 'how many people',
	closes: 'closes the structure',
	overrides: 'ranges of holes',
	about: 'what it is',
	outline: 'which part'
};

function hours(minutes: number): string {
	const whole = Math.floor(minutes / 60);
	const rest = minutes % 60;
	return [whole > 0 && `${whole} h`, (rest > 0 || whole === 0) && `${rest} min`]
		.filter(Boolean)
		.join(' ');
}

/** Who decided on a defect, and on what, as far as the line says. */
function decidedBy(
	{ decidedBy: person, basis }: Body<'defect.fixed'> | Body<'defect.decided'>,
	names: Names
): string | undefined {
	const by = [person && names.person(person), basis && BASIS_WORDS[basis]].filter(Boolean);
	return by.length > 0 ? `by ${by.join(', ')}` : undefined;
}

function join(...parts: (string | false | undefined)[]): string {
	return parts.filter(Boolean).join(' · ');
}
