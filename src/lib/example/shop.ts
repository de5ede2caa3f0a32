/**
 * The shop: what is planned, what is in hand, and what was put off to another evening. The evenings themselves are in
 * `evenings.ts`, faults in `faults.ts`, the inspector in `visits.ts`.
 */
import type { SeamOverride } from '$lib/logbook/kinds';
import type { Device, Member } from './crew';
import type { Hole, Pen } from './pen';
import type { PlannedAssembly, PlannedSeam } from './plan';

export interface Assembly {
	readonly id: string;
	readonly steps: readonly { readonly id: string; readonly number: boolean; unit?: string }[];
	readonly seams: Seam[];
	/** Every seam it will have is planned. */
	complete: boolean;
	closed: boolean;
}

export interface Seam {
	readonly id: string;
	readonly assembly: Assembly;
	readonly plan: PlannedSeam;
	/** In the order they are driven. Empty until the crew starts on the seam. */
	holes: Hole[];
	/** How many of them were driven or left open. */
	next: number;
	started: boolean;
	/** Driven since the bucker last gave their word. */
	unseen: Hole[];
	/** Defects that nothing settled yet. */
	readonly defects: Set<string>;
	/** Things put off to a later evening: the seam is not closed over them. */
	waiting: number;
	signed?: string;
}

/** Who writes, drives and bucks tonight. Shooter and bucker need no account. */
export interface Crew {
	readonly device: Device;
	readonly shooter: string;
	readonly bucker: string | undefined;
}

/** So many evenings before the end. */
const LATE = 6;

export class Shop {
	/** Seams that are not finished, in the order they are worked on. */
	readonly queue: Seam[] = [];
	/** Seams finished whose inspection was asked for and not answered: the seam and the line that asks. */
	readonly asked: { readonly seam: Seam; readonly line: string }[] = [];
	/** Assemblies whose seams are all finished and that are not closed. */
	readonly finished = new Set<Assembly>();
	/** Number of the evening, from 1. */
	evening = 0;
	/** Persons without an account, by the line that named them. */
	readonly helpers: string[] = [];
	readonly #tasks = new Map<number, (() => void)[]>();
	readonly #happened = new Set<string>();
	#planned = 0;
	#assemblies = 0;

	constructor(
		readonly pen: Pen,
		readonly members: readonly Member[],
		readonly devices: readonly [Device, ...Device[]],
		readonly plan: readonly PlannedAssembly[],
		/** Number of the last evening; Infinity where the lines decide. */
		readonly lastEvening: number
	) {}

	get owner(): Device {
		return this.devices[0];
	}

	/** Devices of people in this role, in order. */
	devicesIn(...roles: readonly Member['role'][]): Device[] {
		return this.devices.filter((device) =>
			this.members.some(({ id, role }) => id === device.person && roles.includes(role))
		);
	}

	/** The last evenings, where it is known which is the last: what comes up now is left to be settled. */
	get isLate(): boolean {
		return this.evening > this.lastEvening - LATE;
	}

	/** Once for certain, as soon as it can be, and once more late; otherwise in a share of cases. */
	seldom(what: string, share: number): boolean {
		const once = this.isLate ? `${what}, late` : what;
		if (this.#happened.has(once)) return this.pen.random.chance(share);
		this.#happened.add(once);
		return true;
	}

	/** Puts something off by so many evenings. What is due after the last evening stays undone, as in any shop. */
	later(evenings: number, task: () => void): void {
		const due = this.evening + Math.max(1, evenings) + (this.isLate ? LATE : 0);
		const list = this.#tasks.get(due);
		if (list) list.push(task);
		else this.#tasks.set(due, [task]);
	}

	/** The same for a seam, which is not closed before. */
	laterAt(seam: Seam, evenings: number, task: () => void): void {
		seam.waiting++;
		this.later(evenings, () => {
			seam.waiting--;
			task();
		});
	}

	doWhatIsDue(): void {
		const due = this.#tasks.get(this.evening) ?? [];
		this.#tasks.delete(this.evening);
		for (const task of due) task();
	}

	/** Writes the plan of so many more seams: the example's, over and over, with numbers appended from the second time on. */
	planSeams(count: number): void {
		const { pen, owner, plan } = this;
		const all = plan.flatMap((assembly) => assembly.seams.map((seam) => ({ assembly, seam })));
		let current = this.queue.at(-1)?.assembly;
		for (let i = 0; i < count; i++, this.#planned++) {
			const at = all[this.#planned % all.length];
			if (!at) return;
			const round = Math.floor(this.#planned / all.length) + 1;
			const name = (text: string) => (round === 1 ? text : `${text} ${round}`);
			const first = at.assembly.seams[0] === at.seam;
			if (first || !current || current.complete) current = this.#planAssembly(at.assembly, name);
			const id = pen.newId(owner.id);
			const overrides = at.seam.overrides.map((override): [string, SeamOverride] => [
				pen.newId(owner.id),
				override
			]);
			pen.wait(2, 6);
			pen.write(
				owner,
				'seam.planned',
				{
					...at.seam.body,
					name: name(at.seam.name),
					assembly: current.id,
					order: (current.seams.length + 1) * 10,
					...(overrides.length > 0 && { overrides: Object.fromEntries(overrides) })
				},
				{ seam: id }
			);
			const seam: Seam = {
				id,
				assembly: current,
				plan: at.seam,
				holes: [],
				next: 0,
				started: false,
				unseen: [],
				defects: new Set(),
				waiting: 0
			};
			current.seams.push(seam);
			current.complete = at.assembly.seams.at(-1) === at.seam;
			this.queue.push(seam);
		}
	}

	#planAssembly(planned: PlannedAssembly, name: (text: string) => string): Assembly {
		const { pen, owner } = this;
		const id = pen.newId(owner.id);
		const steps = planned.steps.map((step) => ({ id: pen.newId(owner.id), step }));
		pen.wait(3, 12);
		pen.write(
			owner,
			'assembly.planned',
			{
				name: name(planned.name),
				order: ++this.#assemblies * 10,
				outline: planned.outline,
				drawing: planned.drawing,
				...(steps.length > 0 && {
					steps: Object.fromEntries(steps.map(({ id: of, step }, i) => [of, { ...step, order: i }]))
				})
			},
			{ assembly: id }
		);
		return {
			id,
			steps: steps.map(({ id: of, step: { value, unit } }) => ({
				id: of,
				number: value === 'number',
				...(unit !== undefined && { unit })
			})),
			seams: [],
			complete: false,
			closed: false
		};
	}
}

/** Every hole has at most one head, nothing is wrong with any and nothing was put off. */
export function isClean(seam: Seam): boolean {
	return (
		seam.waiting === 0 &&
		seam.defects.size === 0 &&
		seam.holes.every(({ heads }) => heads.length === 1)
	);
}

/** What the plan says of a hole where it differs from the seam. Holes added later follow the seam. */
export function overrideAt(seam: Seam, hole: Hole): SeamOverride | undefined {
	if (hole.by !== undefined) return undefined;
	return seam.plan.overrides.find(({ holes }) =>
		holes.some(({ from, to }) => from <= hole.index && hole.index <= to)
	);
}

/** Rivet diameter in 32nds of an inch, by the callout's first dash number (NASM20470: `AD4` is 4/32). */
export function thirtySeconds(callout: string): number {
	return Number(/AD(\d)/.exec(callout)?.[1] ?? 4);
}
