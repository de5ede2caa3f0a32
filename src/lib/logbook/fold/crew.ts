/**
 * Who is in the crew, from the crew lines alone: the same on a phone and on the server, in whatever order the lines
 * arrived. Like everything else in the log a crew line covers those it stands on, and only those: after a restored
 * backup an old joining that comes back, known to whoever was removed since, must not count as the latest word.
 */
import type { Entry } from '../entry';
import type { Role } from '../kinds';
import { gather } from './gather';
import { headsOf } from './heads';
import type { Line } from './line';

const CREW_KINDS = ['crew.joined', 'crew.role', 'crew.left', 'owner.changed'] as const;
type CrewEntry = Extract<Entry, { kind: (typeof CREW_KINDS)[number] }>;

export interface CrewState {
	/** Of one who left: the last they had. */
	readonly role: Role;
	readonly left: boolean;
}

/** Who may least comes first: of two roles given without knowing of each other the first here holds. */
const RISING: readonly Role[] = ['follower', 'builder', 'inspector', 'owner'];

export function isCrewEntry(entry: Entry | undefined): entry is CrewEntry {
	return entry !== undefined && (CREW_KINDS as readonly string[]).includes(entry.kind);
}

/** Whom a crew line speaks of. */
export function spokenOf(entry: CrewEntry): readonly string[] {
	return entry.kind === 'owner.changed' ? [entry.body.from, entry.body.to] : [entry.body.person];
}

/** The ids a new crew line about these people stands on, ascending. */
export function crewHeads(lines: readonly Line[], people: readonly string[]): string[] {
	const about = claims(lines);
	const heads = people.flatMap((person) => headsOf(about.get(person) ?? [], () => false));
	return [...new Set(heads.map((line) => line.id))].sort();
}

/** @param lines in order; crew lines and the one that opened the build, others are passed over */
export function crewOf(lines: readonly Line[]): Map<string, CrewState> {
	const crew = new Map<string, CrewState>();
	for (const [person, about] of claims(lines)) {
		const leavings = new Set(
			about.flatMap(({ id, entry }) => (entry?.kind === 'crew.left' ? id : []))
		);
		const left = headsOf(about, () => false).some(({ id }) => leavings.has(id));
		// A leaving names no role; the one before it is seen through it.
		const roles = headsOf(about, (id) => leavings.has(id)).map((line) => roleIn(line, person));
		crew.set(person, { role: RISING.find((role) => roles.includes(role)) ?? 'follower', left });
	}
	for (const { entry } of lines)
		if (entry?.kind === 'build.opened' && !crew.has(entry.author))
			crew.set(entry.author, { role: 'owner', left: false });
	keepAnOwner(crew, lines);
	return crew;
}

/**
 * A build without an owner could never have one again. It comes to that when it was handed, in a part of the history
 * that was lost and came back, to somebody who was removed since: then it is still the last owner's who is there.
 */
function keepAnOwner(crew: Map<string, CrewState>, lines: readonly Line[]): void {
	if ([...crew.values()].some(({ role, left }) => role === 'owner' && !left)) return;
	const owners = lines.flatMap(({ entry }) => {
		switch (entry?.kind) {
			case 'build.opened':
				return [entry.author];
			case 'owner.changed':
				return [entry.body.from, entry.body.to];
			case 'crew.joined':
			case 'crew.role':
				return entry.body.role === 'owner' ? [entry.body.person] : [];
			default:
				return [];
		}
	});
	const owner = owners.findLast((person) => crew.get(person)?.left === false);
	if (owner !== undefined) crew.set(owner, { role: 'owner', left: false });
}

/** The lines that speak of each person, in order. */
function claims(lines: readonly Line[]): Map<string, Line[]> {
	const about = new Map<string, Line[]>();
	for (const line of lines) {
		if (!isCrewEntry(line.entry)) continue;
		for (const person of new Set(spokenOf(line.entry))) {
			gather(about, person, line);
		}
	}
	return about;
}

function roleIn({ entry }: Line, person: string): Role | undefined {
	switch (entry?.kind) {
		case 'crew.joined':
		case 'crew.role':
			return entry.body.role;
		case 'owner.changed':
			return entry.body.to === person ? 'owner' : 'builder';
		default:
			return undefined;
	}
}
