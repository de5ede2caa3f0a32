/**
 * The plan of the example: an invented two-seat low-wing aeroplane of nobody's design, 16 assemblies and 130 seams.
 * Its text is `plan.csv`; what a column has no room for stands in the note, in words, and is read from there.
 */
import type { Body, Length, Prep, SeamOverride, Sheet } from '$lib/logbook/kinds';
import { parseLength } from '$lib/rivet/length';
import { readCsv } from './csv';

/** A seam as it will be planned, before it has an id, an order and an assembly to stand in. */
export interface PlannedSeam {
	readonly name: string;
	readonly body: Readonly<
		Omit<Body<'seam.planned'>, 'name' | 'assembly' | 'order' | 'overrides'> & { callout: string }
	>;
	/** Ranges that differ; each gets an id when it is planned. */
	readonly overrides: readonly SeamOverride[];
}

interface PlannedStep {
	readonly text: string;
	readonly value?: 'number';
	readonly unit?: string;
}

export interface PlannedAssembly {
	readonly name: string;
	/** Which part it is: the name of the outline drawn on the wall. */
	readonly outline: string;
	readonly drawing: string;
	/** What has to be done beside rivets before it is closed. */
	readonly steps: readonly PlannedStep[];
	readonly seams: readonly PlannedSeam[];
}

const COLUMNS = 'assembly,seam,callout,sheets,holes,rows,pitch_in,edge_in,note';

/**
 * Assemblies in the order they are built, each with its seams in order.
 * @param csv text with the columns of `plan.csv`; sizes in decimal inches
 * @throws Error that names the row which cannot be read
 */
export function readPlan(csv: string): PlannedAssembly[] {
	const [head, ...rows] = readCsv(csv);
	if (head?.join() !== COLUMNS) throw new Error(`the columns must be ${COLUMNS}`);
	const assemblies = new Map<string, PlannedAssembly & { seams: PlannedSeam[] }>();
	for (const [i, row] of rows.entries()) {
		try {
			const [name = '', ...cells] = row;
			let assembly = assemblies.get(name);
			if (!assembly) {
				assembly = assemblyOf(name, assemblies.size + 1);
				assemblies.set(name, assembly);
			}
			assembly.seams.push(seamOf(cells, assembly));
		} catch (error) {
			throw new Error(`row ${i + 2}: ${error instanceof Error ? error.message : ''}`, {
				cause: error
			});
		}
	}
	return [...assemblies.values()].map((assembly) => ({ ...assembly, steps: stepsOf(assembly) }));
}

// ---- columns --------------------------------------------------------------------------------------------

function seamOf(cells: readonly string[], assembly: PlannedAssembly): PlannedSeam {
	const [name = '', callout = '', sheets = '', holes = '', rows = '', pitch = '', edge = ''] =
		cells;
	const note = cells[7] ?? '';
	const count = wholeNumber(holes);
	const stack = sheets.split(' + ').map(sheetOf);
	const rowCount = wholeNumber(rows);
	const [endOne, endLast] = endsOf(assembly.name, name);
	const says = (what: RegExp) => what.test(note);
	return {
		name,
		body: {
			holes: { count, first: 1 },
			callout,
			stack,
			pattern: says(/nutplates, two rivets each/) ? 'nutplates' : rowCount > 1 ? 'rows' : 'row',
			rows: rowCount,
			...(says(/staggered/) && { layout: 'staggered' as const }),
			pitch: inches(pitch),
			edge: inches(edge),
			endOne,
			endLast,
			drawing: assembly.drawing,
			step: String(assembly.seams.length + 1),
			people: says(/needs two people/i) ? 2 : 1,
			sealing: says(/\bwet\b/i) ? 'wet' : 'dry',
			closes: says(/closes the structure/i),
			method: says(/squeezed/i) ? 'squeezed' : says(/back-riveted/i) ? 'back_riveted' : 'driven',
			...(note !== '' && { note })
		},
		overrides: overridesOf(note, count, callout, stack)
	};
}

const PREPS: Readonly<Record<string, Prep>> = {
	plain: 'plain',
	dimple: 'dimple',
	csk: 'countersunk',
	'csk-under-dimple': 'countersunk_under_dimple'
};

/** `0.025 2024-T42 dimple`: thickness in inches, alloy and temper, preparation. */
function sheetOf(text: string): Sheet {
	const [thickness = '', material = '', prep = '', ...rest] = text.split(' ');
	const known = PREPS[prep];
	if (!known || rest.length > 0) throw new Error(`“${text}” is not a sheet`);
	return { thickness: inches(thickness), material, prep: known };
}

function inches(text: string): Length {
	const read = parseLength(text, 'in');
	if (!read.ok) throw new Error(read.says);
	// `1` would read as a fraction; the file has decimals only.
	return { ...read.length, unit: 'in' };
}

function wholeNumber(text: string): number {
	if (!/^[1-9]\d{0,4}$/.test(text)) throw new Error(`“${text}” is not a number of holes or rows`);
	return Number(text);
}

// ---- what the notes say ---------------------------------------------------------------------------------

function overridesOf(
	note: string,
	count: number,
	callout: string,
	stack: readonly Sheet[]
): SeamOverride[] {
	const overrides: SeamOverride[] = [];
	const range = (from: number, to: number) => [{ from, to }];

	const shorter = /to (\d\.\d+): holes (\d+)-(\d+) take (-[\d.]+)/.exec(note);
	if (shorter) {
		const [, thickness = '', from, to, dash = ''] = shorter;
		const last = stack.at(-1);
		overrides.push({
			holes: range(Number(from), Number(to)),
			callout: callout.replace(/-[\d.]+$/, dash),
			...(last && { stack: [...stack.slice(0, -1), { ...last, thickness: inches(thickness) }] })
		});
	}
	const pulled = /last (\d+) holes pulled rivets, (.+)$/.exec(note);
	if (pulled)
		overrides.push({
			holes: range(count - Number(pulled[1]) + 1, count),
			method: 'pulled',
			...(pulled[2] && { note: pulled[2] })
		});
	const until = /holes (\d+)-(\d+) left open until (.+)$/.exec(note);
	if (until?.[3])
		overrides.push({ holes: range(Number(until[1]), Number(until[2])), leaveOpen: until[3] });
	const leave = /Leave holes (\d+)-(\d+) open: (.+)$/.exec(note);
	if (leave?.[3])
		overrides.push({ holes: range(Number(leave[1]), Number(leave[2])), leaveOpen: leave[3] });
	// The first eight, since hole 1 is inboard, where rib 1 is.
	const rib = /holes next to rib 1 left open until (.+)$/.exec(note);
	if (rib?.[1]) overrides.push({ holes: range(1, 8), leaveOpen: rib[1] });
	return overrides;
}

/** Invented: which part an assembly is, by its name, and which end hole 1 is at. */
const PARTS: readonly (readonly [RegExp, string, readonly [string, string]])[] = [
	[/stabilizer/i, 'stabilizer', ['left tip', 'right tip']],
	[/elevator/i, 'elevator', ['inboard', 'outboard']],
	[/^fin$/i, 'fin', ['bottom', 'top']],
	[/rudder/i, 'rudder', ['bottom', 'top']],
	[/wing spar/i, 'spar', ['inboard', 'outboard']],
	[/wing box/i, 'wing', ['inboard', 'outboard']],
	[/fuel bay/i, 'tank', ['inboard', 'outboard']],
	[/flap|aileron/i, 'flap', ['inboard', 'outboard']],
	[/center section/i, 'floor', ['left', 'right']],
	[/forward fuselage/i, 'fuselage', ['forward', 'aft']],
	[/tail cone/i, 'tail_cone', ['forward', 'aft']]
];

function partOf(assembly: string): (typeof PARTS)[number] | undefined {
	return PARTS.find(([pattern]) => pattern.test(assembly));
}

function assemblyOf(name: string, place: number): PlannedAssembly & { seams: PlannedSeam[] } {
	const outline = partOf(name)?.[1];
	if (outline === undefined) throw new Error(`no outline for “${name}”`);
	return { name, outline, drawing: `YT-${String(place).padStart(2, '0')}`, steps: [], seams: [] };
}

function endsOf(assembly: string, seam: string): readonly [string, string] {
	if (/firewall/i.test(seam)) return ['left', 'right'];
	return partOf(assembly)?.[2] ?? ['first', 'last'];
}

function stepsOf({ outline, seams }: PlannedAssembly): PlannedAssembly['steps'] {
	const steps: PlannedStep[] = [];
	if (outline === 'tank')
		steps.push({
			text: 'Leak test: pressure held for 24 hours, by the drawing',
			value: 'number',
			unit: 'psi'
		});
	if (seams.some(({ body }) => /brake lines/.test(body.note ?? '')))
		steps.push({ text: 'Brake lines pressure-tested', value: 'number', unit: 'psi' });
	if (seams.some(({ body }) => body.closes))
		steps.push({ text: 'Look inside: swarf, tools and clecos out, photos taken' });
	return steps;
}
