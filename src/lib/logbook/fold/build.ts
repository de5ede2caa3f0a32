/** The fold of everything that concerns no seam: the build, its crew and devices, its assemblies, what is in use. */
import { isKind, inOrder, type Line } from './line';
import type { Role } from '../kinds';
import type { Entry } from '../entry';
import { crewOf } from './crew';
import { fieldsOf, members, type Field } from './fields';
import { gather } from './gather';
import { headsOf } from './heads';
import { strikesOf, type Strikes } from './strikes';

export interface Assembly {
	readonly id: string;
	readonly name: string;
	readonly order: number;
	readonly outline?: string;
	readonly note?: string;
	readonly fields: ReadonlyMap<string, Field>;
	readonly steps: readonly (readonly [string, { readonly text: string }])[];
	readonly retired: boolean;
	readonly closed: boolean;
	/** Lines a new closing or reopening stands on. */
	readonly closing: readonly string[];
}

export interface Build {
	readonly name: string;
	readonly about?: string;
	readonly units: 'in' | 'mm';
	readonly rules: ReadonlyMap<string, string>;
	readonly fields: ReadonlyMap<string, Field>;
	/** As the log has it: a role, or `left`. */
	readonly crew: ReadonlyMap<string, Role | 'left'>;
	readonly devices: ReadonlyMap<
		string,
		{ readonly person: string; readonly key: string; readonly line: string }
	>;
	/** Helpers without an account, by the id of the line that named them. */
	readonly named: ReadonlyMap<string, string>;
	/** In order, retired ones last. */
	readonly assemblies: readonly Assembly[];
	/** Live setups, bags and sealants, the newest first. */
	readonly setups: readonly Entry<'setup.made'>[];
	readonly bags: readonly Entry<'bag.opened'>[];
	readonly sealants: readonly Entry<'sealant.mixed'>[];
	readonly lines: readonly Line[];
	readonly struck: Strikes['struck'];
	/** Fields with two values, as `assembly id or build: field`. */
	readonly differing: readonly {
		readonly of: string;
		readonly field: string;
		readonly lines: readonly string[];
	}[];
	readonly unreadable: readonly string[];
}

/** @param unordered all lines of the build that concern no seam */
export function foldBuild(unordered: readonly Line[]): Build {
	const lines = inOrder(unordered);
	const { struck } = strikesOf(lines);
	const isStruck = (id: string) => struck.has(id);
	const live = lines.filter((line) => !isStruck(line.id));

	const fields = fieldsOf(
		lines.filter((line) => isKind(line, 'build.opened', 'build.described')),
		isStruck
	);
	const crew = new Map(
		[...crewOf(lines)].map(([person, { role, left }]) => [person, left ? 'left' : role] as const)
	);
	const devices = new Map<string, { person: string; key: string; line: string }>();
	const named = new Map<string, string>();
	const setups: Entry<'setup.made'>[] = [];
	const bags: Entry<'bag.opened'>[] = [];
	const sealants: Entry<'sealant.mixed'>[] = [];
	for (const line of live) {
		const { entry } = line;
		switch (entry?.kind) {
			case 'device.enrolled':
				// The first enrolment of a device holds: a later one could only try to take it over.
				if (!devices.has(entry.device))
					devices.set(entry.device, { person: entry.author, key: entry.body.key, line: entry.id });
				break;
			case 'person.named':
				named.set(entry.id, entry.body.name);
				break;
			case 'setup.made':
				setups.unshift(entry);
				break;
			case 'bag.opened':
				bags.unshift(entry);
				break;
			case 'sealant.mixed':
				sealants.unshift(entry);
				break;
		}
	}

	const assemblies = assembliesOf(lines, isStruck);
	const differing = [{ id: 'build', fields }, ...assemblies].flatMap(({ id, fields: own }) =>
		[...own]
			.filter(([, field]) => field.differs)
			.map(([field, { heads }]) => ({ of: id, field, lines: heads.map(({ line }) => line) }))
	);
	const about = fields.get('about')?.value as string | undefined;
	return {
		name: (fields.get('name')?.value as string | undefined) ?? '',
		...(about !== undefined && { about }),
		units: (fields.get('units')?.value as 'in' | 'mm' | undefined) ?? 'in',
		rules: new Map(members(fields, 'rules') as [string, string][]),
		fields,
		crew,
		devices,
		named,
		assemblies,
		setups,
		bags,
		sealants,
		lines,
		struck,
		differing,
		unreadable: lines
			.filter((line) => line.unreadable && line.unreadable !== 'withdrawn')
			.map((line) => line.id)
	};
}

function assembliesOf(lines: readonly Line[], isStruck: (id: string) => boolean): Assembly[] {
	const byAssembly = new Map<string, Line[]>();
	for (const line of lines) {
		const { assembly } = line.envelope;
		if (assembly === undefined) continue;
		gather(byAssembly, assembly, line);
	}
	return [...byAssembly]
		.filter(([id, own]) => own.some((line) => line.id === id))
		.map(([id, own]): Assembly => {
			const fields = fieldsOf(
				own.filter((line) => isKind(line, 'assembly.planned', 'assembly.changed')),
				isStruck
			);
			const value = (name: string) => fields.get(name)?.value as string | undefined;
			const closing = headsOf(
				own.filter((line) => isKind(line, 'assembly.closed', 'assembly.reopened')),
				isStruck
			);
			const outline = value('outline');
			const note = value('note');
			return {
				id,
				name: value('name') ?? '',
				order: (fields.get('order')?.value as number | undefined) ?? 0,
				...(outline !== undefined && { outline }),
				...(note !== undefined && { note }),
				fields,
				steps: members(fields, 'steps') as [string, { text: string }][],
				retired: own.some((line) => isKind(line, 'assembly.retired') && !isStruck(line.id)),
				// Closed by one and reopened by another who did not know: closed, the stricter, until somebody settles it.
				closed: closing.some((line) => isKind(line, 'assembly.closed')),
				closing: closing.map((line) => line.id)
			};
		})
		.sort(
			(a, b) => Number(a.retired) - Number(b.retired) || a.order - b.order || (a.id < b.id ? -1 : 1)
		);
}
