import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { ANA, BUILD, idOf, JO, Scribe } from '../../../../tests/support/scribe';
import type { Line } from './line';
import { foldSeam, headsAt, rangesOf, type Hole, type Seam } from './seam';
import { eveningOf, summarise, totalsOf } from './summary';

function scene(count = 10) {
	const scribe = new Scribe();
	const seam = scribe.seam(count);
	const fold = (lines: readonly Line[] = scribe.lines) => foldSeam(seam, lines);
	const hole = (index: number, folded: Seam = fold()) =>
		folded.holes.find((found) => found.index === index && !found.by) as Hole;
	return { scribe, seam, fold, hole };
}

describe('a hole', () => {
	it('is open, then driven, then open again when the line is struck, and open for good', () => {
		const { scribe, seam, fold, hole } = scene();
		expect(hole(1).state).toBe('open');
		const run = scribe.drive(seam, 1, 5);
		expect(summarise(fold())).toMatchObject({ holes: 10, driven: 5, open: 5 });
		scribe.strike(run);
		expect(summarise(fold())).toMatchObject({ driven: 0, open: 10, struck: 1 });
	});

	it('driven by two phones that did not know of each other counts once and says so', () => {
		const { scribe, seam, fold } = scene();
		const a = scribe.drive(seam, 1, 5);
		const b = scribe.drive(seam, 4, 8, { author: JO });
		const folded = fold();
		expect(summarise(folded)).toMatchObject({ driven: 8, twice: 2 });
		expect(folded.findings).toEqual([
			{ is: 'driven_twice', holes: [':4', ':5'], lines: [a.id, b.id] }
		]);
		expect(headsAt(folded.holes)).toEqual([a.id, b.id].sort());
	});

	it('logged twice is settled by a line that stands on both, or by striking one', () => {
		const { scribe, seam, fold } = scene();
		const a = scribe.drive(seam, 1, 5);
		const b = scribe.drive(seam, 1, 5, { author: JO });
		const settled = scribe.drive(seam, 1, 5, { on: [a, b] });
		expect(fold().findings).toEqual([]);
		expect(fold().holes[0]?.heads).toEqual([settled.id]);
		const other = scene();
		const first = other.scribe.drive(other.seam, 1, 5);
		const second = other.scribe.drive(other.seam, 1, 5, { author: JO });
		other.scribe.strike(second, first);
		expect(other.fold().findings).toEqual([]);
		expect(other.hole(1).heads).toEqual([first.id]);
	});

	it('driven by one and drilled out by another is contested and not done', () => {
		const { scribe, seam, fold, hole } = scene();
		const run = scribe.drive(seam, 1, 5);
		scribe.write('holes.drilled_out', { holes: [{ from: 2, to: 2 }] }, { seam, on: [run] });
		const other = scribe.drive(seam, 2, 2, { on: [run], author: JO });
		expect(hole(2).state).toBe('contested');
		expect(summarise(fold())).toMatchObject({ driven: 4, contested: 1 });
		expect(fold().findings).toMatchObject([{ is: 'contested', holes: [':2'] }]);
		const drilled = scribe.lines.at(-2) as Line;
		scribe.drive(seam, 2, 2, { on: [drilled, other] });
		expect(hole(2).state).toBe('driven');
	});

	it('covers only the holes both lines name', () => {
		const { scribe, seam, hole } = scene();
		const run = scribe.drive(seam, 1, 5);
		scribe.write('holes.drilled_out', { holes: [{ from: 5, to: 6 }] }, { seam, on: [run] });
		expect([1, 4, 5, 6].map((index) => hole(index).state)).toEqual([
			'driven',
			'driven',
			'drilled_out',
			'drilled_out'
		]);
	});

	it('is covered through a struck line, which by itself covers nothing', () => {
		const { scribe, seam, hole } = scene();
		const run = scribe.drive(seam, 1, 1);
		const drilled = scribe.write(
			'holes.drilled_out',
			{ holes: [{ from: 1, to: 1 }] },
			{ seam, on: [run] }
		);
		const again = scribe.drive(seam, 1, 1, { on: [drilled] });
		const strike = scribe.strike(drilled);
		expect(hole(1).heads).toEqual([again.id]);
		scribe.strike(again, undefined, { on: [strike] });
		expect(hole(1).heads).toEqual([run.id]);
	});

	it('does not go backwards in cause: a line that claims to stand on a later one covers nothing', () => {
		const { scribe, seam, hole } = scene();
		const late = scribe.drive(seam, 1, 1, { n: 50 });
		const early = scribe.drive(seam, 1, 1, { n: 40, on: [late] });
		expect(hole(1).heads).toEqual([early.id, late.id]);
	});

	it('added later lies where it was put, has its own number, and a number given twice is a finding', () => {
		const { scribe, seam, fold } = scene(4);
		const added = scribe.write(
			'holes.added',
			{ count: 2, first: 4, after: { index: 2 } },
			{ seam }
		);
		const folded = fold();
		expect(folded.holes.map((found) => found.number)).toEqual([1, 2, 4, 5, 3, 4]);
		expect(folded.findings).toEqual([
			{ is: 'number_twice', number: 4, holes: [`${added.id}:1`, ':4'] }
		]);
		scribe.drive(seam, 1, 1);
		scribe.write(
			'holes.driven',
			{ holes: [{ by: added.id, from: 1, to: 2 }], method: 'squeezed' },
			{ seam }
		);
		expect(summarise(fold())).toMatchObject({ holes: 6, driven: 3 });
	});

	it('of the plan has one name: a line that names it by its seam is refused', () => {
		const { scribe, seam } = scene(4);
		const body = { holes: [{ by: seam, from: 1, to: 2 }], method: 'driven' } as const;
		expect(scribe.read('holes.driven', body as never, { seam })).toMatchObject({
			code: 'entry.malformed'
		});
	});

	it('that no plan knows stays, shown and counted apart', () => {
		const { scribe, seam, fold } = scene(4);
		scribe.drive(seam, 3, 6);
		expect(summarise(fold())).toMatchObject({ holes: 4, driven: 2, outside: 2 });
		expect(fold().findings).toMatchObject([{ is: 'outside', holes: [':5', ':6'] }]);
	});

	it('retired is no longer of the plan; with a rivet in it, it is counted apart', () => {
		const { scribe, seam, fold } = scene(6);
		const run = scribe.drive(seam, 1, 2);
		scribe.write('holes.retired', { holes: [{ from: 2, to: 4 }] }, { seam, on: [run] });
		expect(summarise(fold())).toMatchObject({ holes: 3, driven: 1, outside: 1, open: 2 });
	});

	it('keeps its readings and its looks with the rivet they were of', () => {
		const { scribe, seam, hole } = scene();
		const run = scribe.drive(seam, 1, 1);
		const what = { is: 'hole', index: 1 } as const;
		scribe.write(
			'reading.taken',
			{ what, found: { by: 'gauge', size: 'inside' } },
			{ seam, on: [run] }
		);
		scribe.write('holes.looked_at', { holes: [{ from: 1, to: 1 }], by: JO }, { seam, on: [run] });
		const limits = {
			source: 'common practice',
			widthLeast: { nm: 4_000_000, unit: 'in' }
		} as const;
		const width = { nm: 3_999_999, unit: 'mm' } as const;
		scribe.write(
			'reading.taken',
			{ what, found: { by: 'caliper', width }, limits },
			{ seam, on: [run] }
		);
		expect(hole(1)).toMatchObject({ good: 1, bad: 1, looked: true, state: 'driven' });
		const drilled = scribe.write(
			'holes.drilled_out',
			{ holes: [{ from: 1, to: 1 }] },
			{ seam, on: [run] }
		);
		scribe.drive(seam, 1, 1, { on: [drilled] });
		expect(hole(1)).toMatchObject({ good: 0, bad: 0, looked: false, state: 'driven' });
	});
});

describe('a strike', () => {
	it('of two lines in each other’s favour leaves the earlier', () => {
		const { scribe, seam, fold, hole } = scene();
		const a = scribe.drive(seam, 1, 5);
		const b = scribe.drive(seam, 1, 5, { author: JO });
		scribe.strike(b, a);
		scribe.strike(a, b, { author: JO });
		expect(hole(1).heads).toEqual([a.id]);
		expect(fold().findings).toEqual([]);
		scribe.strike(a);
		expect(hole(1).heads).toEqual([b.id]);
		scribe.strike(b);
		expect(hole(1).heads).toEqual([]);
	});

	it('of three in a ring leaves the earliest, and one that leads into the ring is struck', () => {
		const { scribe, seam, hole } = scene();
		const tail = scribe.drive(seam, 1, 1);
		const [a, b, c] = [1, 2, 3].map(() => scribe.drive(seam, 1, 1)) as [Line, Line, Line];
		scribe.strike(a, b);
		scribe.strike(b, c);
		scribe.strike(c, a);
		scribe.strike(tail, a);
		expect(hole(1).heads).toEqual([a.id]);
	});

	it('in favour of a line that is struck for itself leaves neither, and says so', () => {
		const { scribe, seam, hole, fold } = scene();
		const a = scribe.drive(seam, 1, 1);
		const b = scribe.drive(seam, 1, 1, { author: JO });
		scribe.strike(b, a);
		scribe.strike(a);
		expect(hole(1).state).toBe('open');
		expect(fold().findings).toMatchObject([{ is: 'kept_is_struck' }]);
	});

	it('of a strike, or of a plan, or of nothing, does nothing and is a finding', () => {
		const { scribe, seam, fold, hole } = scene();
		const run = scribe.drive(seam, 1, 1);
		const strike = scribe.strike(run);
		scribe.strike(strike);
		scribe.strike(scribe.lines[0] as Line);
		scribe.write('entry.struck', { entry: idOf(9999), reason: 'other' }, { seam });
		expect(hole(1).state).toBe('open');
		expect(fold().planned).toBe(true);
		expect(fold().findings).toMatchObject([{ is: 'idle_strike', lines: { length: 3 } }]);
	});
});

describe('a plan', () => {
	it('takes changed fields and leaves the rest', () => {
		const { scribe, seam, fold } = scene();
		const [planned] = scribe.lines as [Line];
		scribe.write('seam.changed', { callout: 'MS20470AD4-5', people: 2 }, { seam, on: [planned] });
		expect(fold().plan).toMatchObject({
			name: 'Skin to spar',
			callout: 'MS20470AD4-5',
			people: 2,
			rows: 1
		});
	});

	it('shows both values two people gave without knowing of each other, until somebody settles it', () => {
		const { scribe, seam, fold } = scene();
		const [planned] = scribe.lines as [Line];
		const a = scribe.write('seam.changed', { callout: 'MS20470AD4-5' }, { seam, on: [planned] });
		const b = scribe.write(
			'seam.changed',
			{ callout: 'MS20470AD4-6', name: 'Rib' },
			{ seam, on: [planned], author: JO }
		);
		expect(fold().findings).toEqual([
			{ is: 'plan_differs', field: 'callout', lines: [a.id, b.id] }
		]);
		expect(
			fold()
				.fields.get('callout')
				?.heads.map(({ value }) => value)
		).toEqual(['MS20470AD4-5', 'MS20470AD4-6']);
		scribe.write('seam.changed', { callout: 'MS20470AD4-5' }, { seam, on: [a, b] });
		expect(fold().findings).toEqual([]);
	});

	it('has each override as a field of its own, and may empty a field again', () => {
		const { scribe, seam, fold, hole } = scene();
		const [planned] = scribe.lines as [Line];
		const [x, y] = [idOf(71), idOf(72)];
		const holes = [{ from: 1, to: 3 }];
		const a = scribe.write(
			'seam.changed',
			{ overrides: { [x]: { holes, method: 'pulled' } }, note: 'x' },
			{ seam, on: [planned] }
		);
		scribe.write(
			'seam.changed',
			{ overrides: { [y]: { holes: [{ from: 9, to: 9 }], leaveOpen: 'root fairing' } } },
			{ seam, on: [planned], author: JO }
		);
		expect(fold().findings).toEqual([]);
		expect(hole(2).override?.method).toBe('pulled');
		expect(hole(9).override?.leaveOpen).toBe('root fairing');
		scribe.write('seam.changed', { overrides: { [x]: null }, note: null }, { seam, on: [a] });
		expect(hole(2).override).toBeUndefined();
		expect(fold().plan.note).toBeUndefined();
	});

	it('puts holes in rows', () => {
		const rows = (plan: Parameters<Scribe['seam']>[1], count = 6) => {
			const scribe = new Scribe();
			return foldSeam(scribe.seam(count, plan), scribe.lines).holes.map((hole) => hole.row);
		};
		expect(rows({ rows: 2 })).toEqual([1, 1, 1, 2, 2, 2]);
		expect(rows({ rows: 2 }, 5)).toEqual([1, 1, 1, 2, 2]);
		expect(rows({ rows: 4 }, 9)).toEqual([1, 1, 1, 2, 2, 3, 3, 4, 4]);
		expect(rows({ rows: 2, numbering: 'across' })).toEqual([1, 2, 1, 2, 1, 2]);
		expect(rows({ perRow: [1, 2, 3] })).toEqual([1, 2, 2, 3, 3, 3]);
	});
});

describe('a defect', () => {
	it('has a state for each hole it names', () => {
		const { scribe, seam, fold } = scene();
		const run = scribe.drive(seam, 1, 5);
		const defect = scribe.write(
			'defect.noted',
			{ holes: [{ from: 2, to: 4 }], fault: 'tipped' },
			{ seam, on: [run] }
		);
		const states = () => fold().defects[0]?.holes.map(({ state }) => state);
		expect(states()).toEqual(['open', 'open', 'open']);
		expect(summarise(fold())).toMatchObject({ defects: 3, driven: 5 });
		scribe.write(
			'defect.decided',
			{ defect: defect.id, holes: [{ from: 3, to: 3 }], decision: 'refer' },
			{ seam, on: [defect] }
		);
		scribe.write(
			'defect.fixed',
			{
				defect: defect.id,
				holes: [{ from: 2, to: 2 }],
				action: 'left_as_is',
				basis: 'drawings'
			},
			{ seam, on: [defect] }
		);
		expect(states()).toEqual(['settled', 'referred', 'open']);
		expect(summarise(fold()).defects).toBe(2);
	});

	it('settled in two ways at once is contested', () => {
		const { scribe, seam, fold } = scene();
		const defect = scribe.write(
			'defect.noted',
			{ holes: [{ from: 2, to: 2 }], fault: 'smile' },
			{ seam }
		);
		const fix = { defect: defect.id, holes: [{ from: 2, to: 2 }] };
		const a = scribe.write(
			'defect.fixed',
			{ ...fix, action: 'left_as_is' },
			{ seam, on: [defect] }
		);
		const b = scribe.write(
			'defect.decided',
			{ ...fix, decision: 'replace' },
			{ seam, on: [defect], author: JO }
		);
		expect(fold().findings).toEqual([
			{ is: 'defect_contested', defect: defect.id, holes: [':2'], lines: [a.id, b.id] }
		]);
		scribe.write('defect.decided', { ...fix, decision: 'leave' }, { seam, on: [a, b] });
		expect(fold().findings).toEqual([]);
	});

	it('that was struck is none', () => {
		const { scribe, seam, fold } = scene();
		scribe.strike(
			scribe.write('defect.noted', { holes: [{ from: 2, to: 2 }], fault: 'smile' }, { seam })
		);
		expect(fold().defects).toEqual([]);
	});
});

describe('the evening', () => {
	it.each([
		['2026-03-14T20:15:00.000+01:00', '2026-03-14'],
		['2026-03-15T03:59:59.000+01:00', '2026-03-14'],
		['2026-03-15T04:00:00.000+01:00', '2026-03-15'],
		['2024-03-01T01:00:00.000-08:00', '2024-02-29']
	])('of %s is %s', (at, day) => {
		expect(eveningOf({ at })).toBe(day);
	});

	it('credits the shooter, else the author, and nothing from before this log', () => {
		const { scribe, seam, fold } = scene();
		scribe.drive(seam, 1, 2);
		scribe.write(
			'holes.driven',
			{ holes: [{ from: 3, to: 5 }], method: 'driven', shooter: JO },
			{ seam }
		);
		scribe.drive(seam, 6, 9, { when: { is: 'before', source: 'paper page 12' } });
		expect(summarise(fold()).evenings).toEqual({ '2026-03-14': { [ANA]: 2, [JO]: 3 } });
	});
});

/** Lines about one small seam, standing on whatever they like, struck at random, some of them nonsense. */
const commands = fc.array(
	fc.record({
		what: fc.constantFrom(
			'drive',
			'leave',
			'drill',
			'retire',
			'look',
			'note',
			'fix',
			'add',
			'change',
			'strike',
			'settle'
		),
		from: fc.integer({ min: 1, max: 7 }),
		size: fc.integer({ min: 0, max: 3 }),
		on: fc.array(fc.nat(), { maxLength: 3 }),
		target: fc.nat(),
		keep: fc.nat(),
		jo: fc.boolean(),
		n: fc.option(fc.integer({ min: 1, max: 60 }), { nil: undefined })
	}),
	{ maxLength: 40 }
);

function play(script: typeof commands extends fc.Arbitrary<infer T> ? T : never): {
	seam: string;
	lines: Line[];
} {
	const scribe = new Scribe();
	const seam = scribe.seam(6);
	const pick = (i: number) => scribe.lines[i % scribe.lines.length] as Line;
	for (const { what, from, size, on, target, keep, jo, n } of script) {
		const holes = [{ from, to: from + size }];
		const options = {
			seam,
			on: [...new Set(on.map(pick))],
			author: jo ? JO : ANA,
			...(n && { n })
		};
		if (what === 'drive') scribe.write('holes.driven', { holes, method: 'driven' }, options);
		if (what === 'leave') scribe.write('holes.left_open', { holes, reason: 'nutplate' }, options);
		if (what === 'drill') scribe.write('holes.drilled_out', { holes }, options);
		if (what === 'retire') scribe.write('holes.retired', { holes }, options);
		if (what === 'look') scribe.write('holes.looked_at', { holes, by: JO }, options);
		if (what === 'note') scribe.write('defect.noted', { holes, fault: 'smile' }, options);
		if (what === 'fix')
			scribe.write(
				'defect.fixed',
				{ defect: pick(target).id, holes, action: 'left_as_is' },
				options
			);
		if (what === 'add')
			scribe.write('holes.added', { count: 2, first: from, after: { index: from } }, options);
		if (what === 'change')
			scribe.write('seam.changed', { name: `n${from}`, people: size > 1 ? 2 : 1 }, options);
		if (what === 'strike' || what === 'settle') {
			const kept = pick(keep);
			if (kept !== pick(target))
				scribe.strike(pick(target), what === 'settle' ? kept : undefined, {
					seam,
					author: options.author,
					...(n && { n })
				});
		}
	}
	return { seam, lines: scribe.lines };
}

describe('the fold', () => {
	it('is the same for every order of arrival, and however often a line arrives', () => {
		fc.assert(
			fc.property(commands, fc.infiniteStream(fc.nat()), (script, stream) => {
				const { seam, lines } = play(script);
				const folded = foldSeam(seam, lines);
				const shuffled = [...lines, ...lines.slice(0, 5)]
					.map((line) => ({ line, at: Number(stream.next().value) }))
					.sort((a, b) => a.at - b.at)
					.map(({ line }) => line);
				expect(foldSeam(seam, shuffled)).toEqual(folded);
			}),
			{ numRuns: 300 }
		);
	});

	it('counts every hole of the plan once, whatever was written', () => {
		fc.assert(
			fc.property(commands, (script) => {
				const { seam, lines } = play(script);
				const folded = foldSeam(seam, lines);
				const { holes, driven, open, leftOpen, drilledOut, contested } = summarise(folded);
				expect(driven + open + leftOpen + drilledOut + contested).toBe(holes);
				expect(new Set(folded.holes.map((hole) => hole.key)).size).toBe(folded.holes.length);
				const planned = folded.holes.filter((hole) => hole.number !== undefined);
				const retired = planned.filter((hole) => hole.state === 'retired').length;
				expect(planned.length - retired).toBe(holes);
			}),
			{ numRuns: 300 }
		);
	});

	it('never loses a rivet to strikes in each other’s favour', () => {
		fc.assert(
			fc.property(fc.array(fc.tuple(fc.nat(4), fc.nat(4)), { maxLength: 12 }), (pairs) => {
				const scribe = new Scribe();
				const seam = scribe.seam(1);
				const runs = [0, 1, 2, 3, 4].map(() => scribe.drive(seam, 1, 1));
				for (const [target, kept] of pairs)
					if (target !== kept) scribe.strike(runs[target] as Line, runs[kept]);
				expect(foldSeam(seam, scribe.lines).holes[0]?.state).toBe('driven');
			}),
			{ numRuns: 300 }
		);
	});

	it('says of each hole what a plain reading of the rule says', () => {
		fc.assert(
			fc.property(commands, (script) => {
				const { seam, lines } = play(script);
				const folded = foldSeam(seam, lines);
				const holding = lines.filter(
					(line) =>
						/driven|left_open|drilled_out|retired/.test(line.entry?.kind ?? '') &&
						line.entry?.kind !== 'seam.retired'
				);
				for (const hole of folded.holes.filter((found) => !found.by)) {
					const naming = holding.filter((line) => {
						const holes = (
							line.entry as { body: { holes: { from: number; to: number; by?: string }[] } }
						).body.holes;
						return holes.some(
							(range) => !range.by && range.from <= hole.index && hole.index <= range.to
						);
					});
					const stands = (above: Line, below: Line): boolean =>
						naming.some(
							(via) =>
								above.envelope.on.includes(via.id) &&
								via.envelope.n < above.envelope.n &&
								(via === below || stands(via, below))
						);
					const live = naming.filter((line) => !folded.struck.has(line.id));
					const heads = live.filter((line) => !live.some((above) => stands(above, line)));
					expect([...hole.heads].sort()).toEqual(heads.map((line) => line.id).sort());
				}
			}),
			{ numRuns: 200 }
		);
	});

	it('bears thousands of strikes that lead into a ring, and more holes than a seam can have', () => {
		const scribe = new Scribe();
		const seam = scribe.seam(1);
		const runs = Array.from({ length: 3000 }, () => scribe.drive(seam, 1, 1));
		for (let i = 0; i < runs.length; i++)
			scribe.strike(runs[i] as Line, runs[i === runs.length - 1 ? i - 1 : i + 1]);
		for (let i = 0; i < 8; i++) scribe.write('holes.added', { count: 5000, first: 1 }, { seam });
		const folded = foldSeam(seam, scribe.lines);
		expect(folded.holes[0]?.heads).toEqual([runs.at(-2)?.id]);
		expect(folded.holes).toHaveLength(1);
	});

	it('settles nothing by a reading that measured nothing, or too coarsely', () => {
		const { scribe, seam, hole } = scene();
		const run = scribe.drive(seam, 1, 1);
		const nm = (value: number) => ({ nm: value, unit: 'mm' }) as const;
		const limits = {
			source: 'common practice',
			widthLeast: nm(4_000_000),
			widthMost: nm(5_000_000)
		};
		const take = (found: object) =>
			scribe.write(
				'reading.taken',
				{ what: { is: 'hole', index: 1 }, found: found as never, limits },
				{ seam, on: [run] }
			);
		take({ by: 'caliper', height: nm(2_000_000) });
		take({ by: 'photo', width: nm(4_050_000), uncertainty: nm(100_000) });
		expect(hole(1)).toMatchObject({ good: 0, bad: 0 });
		take({ by: 'photo', width: nm(4_200_000), uncertainty: nm(100_000) });
		take({ by: 'caliper', width: nm(3_800_000) });
		expect(hole(1)).toMatchObject({ good: 1, bad: 1 });
		expect(
			scribe.read(
				'reading.taken',
				{ what: { is: 'hole', index: 1 }, found: { by: 'caliper' } as never },
				{ seam }
			)
		).toMatchObject({
			code: 'entry.malformed'
		});
	});

	it('costs little for a long seam', () => {
		const scribe = new Scribe();
		const seam = scribe.seam(300);
		for (let i = 1; i <= 300; i++) scribe.drive(seam, i, i);
		expect(summarise(foldSeam(seam, scribe.lines))).toMatchObject({ driven: 300, lines: 301 });
	});

	it('adds up to the build', () => {
		const { seam, fold, scribe } = scene();
		scribe.drive(seam, 1, 4);
		const one = summarise(fold());
		expect(totalsOf([one, one, { ...one, retired: true }])).toMatchObject({
			seams: 2,
			holes: 20,
			driven: 8,
			outside: 4
		});
		expect(BUILD).toBe(scribe.lines[0]?.envelope.build);
	});

	it('names holes by the shortest ranges', () => {
		const holes = [
			{ index: 3 },
			{ index: 1 },
			{ index: 2 },
			{ by: idOf(5), index: 1 },
			{ index: 9 }
		];
		expect(rangesOf(holes)).toEqual([
			{ from: 1, to: 3 },
			{ from: 9, to: 9 },
			{ by: idOf(5), from: 1, to: 1 }
		]);
	});
});
