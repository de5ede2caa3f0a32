import { beforeAll, describe, expect, it } from 'vitest';
import { canonicalText, hashText, tidy } from '$lib/logbook/bytes';
import { holesOf, readEntry, type Entry } from '$lib/logbook/entry';
import { foldBuild, type Build } from '$lib/logbook/fold/build';
import { isKind, type Line } from '$lib/logbook/fold/line';
import { foldSeam, headsAt, holeKey, keysOf, type Seam } from '$lib/logbook/fold/seam';
import { eveningOf, summarise, totalsOf, type SeamSummary } from '$lib/logbook/fold/summary';
import { judge, type Log } from '$lib/logbook/judge';
import { traits } from '$lib/logbook/kinds';
import { digestOf, materialOf } from '$lib/logbook/signoff';
import { EXAMPLE_OWNER } from './crew';
import { exampleLog, generateLog, type GeneratedLog } from './generate';
import { EXAMPLE_BUILD } from './ids';

/** Changes with the generator, the plan and the way ids are made; never from one run to the next. */
const SAME = '4xGN7wld3c6LYUSYN2cXzahoghwTD13hSarOAxgY45A';

const textOf = (entry: Entry) => canonicalText(tidy(entry));
const lineOf = (entry: Entry): Line => ({ id: entry.id, envelope: entry, entry });
const hashOf = ({ entries }: GeneratedLog) => hashText(entries.map(textOf).join('\n'));

function bySeam({ entries }: GeneratedLog): Map<string, Line[]> {
	const seams = new Map<string, Line[]>();
	for (const entry of entries) {
		if (entry.seam === undefined) continue;
		const lines = seams.get(entry.seam);
		if (lines) lines.push(lineOf(entry));
		else seams.set(entry.seam, [lineOf(entry)]);
	}
	return seams;
}

/** Every line is well formed and would be accepted where it stands, by a server that holds those before it. */
function expectAcceptable({ entries, members }: GeneratedLog): void {
	const known = new Map<string, Entry>();
	const devices = new Map<string, string>();
	const written = new Set<string>();
	let maxN = 0;
	const log: Log = {
		role: (person) => members.find(({ id }) => id === person)?.role,
		find: (id) => known.get(id),
		isQuarantined: () => false,
		enrolledFor: (device) => devices.get(device),
		get maxN() {
			return maxN;
		}
	};
	for (const entry of entries) {
		const text = textOf(entry);
		const reading = readEntry(text);
		if (!reading.ok) expect.fail(`${reading.code} ${JSON.stringify(reading)} ${text}`);
		// The server takes the opening of a build without judging it, and writes the crew lines itself.
		const unjudged =
			entry.kind === 'build.opened' || traits(entry.kind, entry.v)?.writer === 'server';
		const judged = unjudged ? 'accept' : judge(entry, log);
		if (judged !== 'accept' && judged.verdict !== 'accept')
			expect.fail(`${JSON.stringify(judged)} ${text}`);
		if (entry.kind === 'device.enrolled') devices.set(entry.device, entry.author);
		known.set(entry.id, entry);
		// Two lines of one device never carry one number: that is how a copied device is told.
		written.add(`${entry.device} ${entry.n}`);
		maxN = Math.max(maxN, entry.n);
	}
	expect(known.size).toBe(entries.length);
	expect(written.size).toBe(entries.length);
}

describe('the example', () => {
	let log: GeneratedLog;
	let seams: Map<string, Line[]>;
	let folded: Seam[];
	let sums: SeamSummary[];
	let build: Build;
	beforeAll(() => {
		log = exampleLog({ today: '2026-12-01', offset: 60 });
		seams = bySeam(log);
		folded = [...seams].map(([id, lines]) => foldSeam(id, lines));
		sums = folded.map(summarise);
		build = foldBuild(log.entries.filter(({ seam }) => seam === undefined).map(lineOf));
	});
	const closed = () => new Set(build.assemblies.filter((one) => one.closed).map((one) => one.id));

	it('is a log every line of which is acceptable', () => {
		expectAcceptable(log);
	});

	it('has 16 assemblies, 130 seams and 9,000 holes, about half done over a year', () => {
		expect(build.name).toBe('Yarrow Two');
		expect(build.assemblies).toHaveLength(16);
		expect(build.crew.size).toBe(4);
		expect(build.devices.size).toBe(log.devices.length + 1);
		expect(build.assemblies.filter(({ closed }) => closed).length).toBeGreaterThan(0);
		const totals = totalsOf(sums);
		expect(totals.seams).toBe(130);
		expect(Math.abs(totals.holes - 9000)).toBeLessThan(30);
		expect(totals.driven / totals.holes).toBeGreaterThan(0.45);
		expect(totals.driven / totals.holes).toBeLessThan(0.57);
		const first = log.entries[0]?.at ?? '';
		const last = log.entries.at(-1)?.at ?? '';
		const days = (Date.parse(last) - Date.parse(first)) / 86_400_000;
		expect(days).toBeGreaterThan(300);
		expect(days).toBeLessThan(390);
	});

	it('has the ids by which an address tells it, and is whoever tries it', () => {
		expect(log.build).toBe(EXAMPLE_BUILD);
		expect(log.members[0]?.id).toBe(EXAMPLE_OWNER);
		expect(build.crew.get(EXAMPLE_OWNER)).toBe('owner');
	});

	it('ends the evening before today, when somebody drove, by the clocks of who looks at it', () => {
		expect(log.entries.every(({ at }) => at.endsWith('+01:00'))).toBe(true);
		const last = log.entries
			.map((entry) => eveningOf(entry) ?? '')
			.sort()
			.at(-1);
		expect(last).toBe('2026-11-30');
		expect(Date.parse(log.entries.at(-1)?.at ?? '')).toBeLessThan(Date.parse('2026-11-30T23:30Z'));
		const tonight = sums.map(({ evenings }) => Object.values(evenings['2026-11-30'] ?? {}));
		const rivets = tonight.flat().reduce((sum, n) => sum + n, 0);
		expect(rivets).toBeGreaterThan(20);
		const [entry] = exampleLog({ today: '2024-03-01', offset: -210 }).entries.slice(-1);
		expect(entry?.at).toMatch(/^2024-02-29T2\d:.*-03:30$/);
		expect(() => exampleLog({ today: 'soon', offset: 0 })).toThrow(RangeError);
	});

	it('leaves a double, a contested hole, open defects and two values of a plan to be settled, all of late', () => {
		const findings = folded.flatMap((seam) => seam.findings.map(({ is }) => is));
		expect(new Set(findings)).toEqual(new Set(['driven_twice', 'contested', 'plan_differs']));
		const states = folded.flatMap((seam) =>
			seam.defects.flatMap(({ holes }) => holes.map(({ state }) => state))
		);
		expect(new Set(states)).toEqual(new Set(['open', 'referred', 'settled']));
		expect(states.filter((state) => state === 'open').length).toBeGreaterThan(2);
		expect(states).toContain('referred');
		const unsettled = folded.flatMap(({ lines, findings, defects }) => {
			const ids = new Set([
				...findings.flatMap((finding) => ('lines' in finding ? finding.lines : [])),
				...defects
					.filter(({ holes }) => holes.some(({ state }) => state !== 'settled'))
					.map(({ id }) => id)
			]);
			return lines.filter(({ id }) => ids.has(id)).map(({ envelope: { at } }) => at.slice(0, 10));
		});
		expect(unsettled.sort()[0]?.slice(0, 7)).toBe('2026-11');
	});

	it('has holes left open, each with its reason, and open seams that need two people', () => {
		const left = folded.flatMap(({ holes, lines }) =>
			holes
				.filter(({ state }) => state === 'left_open')
				.map(({ heads }) => lines.find(({ id }) => id === heads[0])?.entry)
		);
		expect(left.length).toBeGreaterThan(8);
		const reasons = left.map((entry) => entry?.kind === 'holes.left_open' && entry.body.reason);
		expect(new Set(reasons).size).toBeGreaterThan(1);
		expect(sums.filter(({ people, open }) => people === 2 && open > 0).length).toBeGreaterThan(1);
	});

	it('closed assemblies only over seams with nothing open, unsettled or stale', () => {
		expect(closed().size).toBeGreaterThan(4);
		for (const seam of sums.filter(({ assembly }) => closed().has(assembly)))
			expect(seam, seam.name).toMatchObject({
				open: 0,
				leftOpen: 0,
				drilledOut: 0,
				contested: 0,
				defects: 0,
				findings: 0
			});
		const stale = new Set(staleSeams());
		expect(sums.filter(({ assembly, seam }) => closed().has(assembly) && stale.has(seam))).toEqual(
			[]
		);
	});

	it('shows nowhere that five mistakes were planted in its plan', () => {
		expect(log.entries.map(textOf).join('\n')).not.toMatch(/plant|mistake/i);
	});

	/** Seams whose last sign-off does not cover all there is. */
	function staleSeams(): string[] {
		return folded.flatMap(({ id, lines }) => {
			const last = lines.findLast((line) => isKind(line, 'inspection.signed'));
			if (last?.entry.kind !== 'inspection.signed') return [];
			const { covers } = last.entry.body;
			return materialOf(lines).some((material) => !covers.includes(material)) ? [id] : [];
		});
	}

	it('has signed seams, at least one stale and at least one not', () => {
		const stale = [...seams].flatMap(([, lines]) =>
			lines.flatMap(({ entry }) => {
				if (entry?.kind !== 'inspection.signed') return [];
				const { covers, digest } = entry.body;
				const covered = lines.filter(({ id }) => covers.includes(id));
				expect(covered).toHaveLength(covers.length);
				expect(
					digestOf(
						covered.map(({ id, entry: of }) => ({ id, hash: hashText(textOf(of as Entry)) }))
					)
				).toBe(digest);
				return [materialOf(lines).some((id) => !covers.includes(id))];
			})
		);
		expect(new Set(stale)).toEqual(new Set([true, false]));
		expect(staleSeams()).not.toEqual([]);
	});

	it('holds what a year brings', () => {
		const kinds = new Set(log.entries.map(({ kind }) => kind));
		for (const kind of [
			'holes.added',
			'holes.retired',
			'holes.left_open',
			'holes.drilled_out',
			'holes.looked_at',
			'defect.decided',
			'defect.fixed',
			'inspection.refused',
			'entry.struck',
			'sealant.mixed',
			'bag.opened',
			'strip.shot',
			'stock.counted',
			'practice.logged',
			'step.done',
			'assembly.closed',
			'time.worked',
			'person.named'
		])
			expect(kinds, kind).toContain(kind);
		const whens = new Set(log.entries.map(({ when }) => when?.is));
		expect(whens).toEqual(new Set([undefined, 'exact', 'about', 'before']));
	});

	it('writes nothing about a seam whose assembly is closed', () => {
		const closed = new Set<string>();
		const within = new Map<string, string>();
		for (const entry of log.entries) {
			if (entry.kind === 'seam.planned') within.set(entry.id, entry.body.assembly);
			if (entry.seam !== undefined) expect(closed).not.toContain(within.get(entry.seam));
			if (entry.kind === 'assembly.closed') closed.add(entry.assembly ?? '');
		}
		expect(closed.size).toBeGreaterThan(0);
	});
});

describe('a generated log', () => {
	it.each([1, 10, 1000, 20_000])(
		'has exactly %i entries, all acceptable',
		{ timeout: 30_000 },
		(entries) => {
			const log = generateLog({ entries });
			expect(log.entries).toHaveLength(entries);
			expect(log.batches.flatMap((batch) => batch.entries)).toEqual(log.entries);
			for (const { device, entries: own } of log.batches) {
				expect(own.every((entry) => entry.device === device)).toBe(true);
				expect(own.length).toBeLessThanOrEqual(200);
			}
			expectAcceptable(log);
		}
	);

	it('of any length is of about a year', () => {
		for (const entries of [5000, 40_000]) {
			const last = generateLog({ entries }).entries.at(-1)?.at ?? '';
			expect(last.slice(0, 7), String(entries)).toMatch(/^2026-(0[89]|1[0-2])$|^2027-01$/);
		}
	});

	it('is the same bytes for the same seed, and others for another', () => {
		expect(hashOf(generateLog({ seed: 7, entries: 1000 }))).toBe(SAME);
		expect(hashOf(generateLog({ seed: 8, entries: 1000 }))).not.toBe(SAME);
	});

	it('stands each line on the heads the fold finds, but for those written apart', () => {
		const log = generateLog({ seed: 3, entries: 800, people: 5, devices: 7 });
		let apart = 0;
		for (const [id, lines] of bySeam(log))
			lines.forEach(({ entry }, i) => {
				if (!entry || traits(entry.kind, entry.v)?.holds === undefined) return;
				const before = lines.slice(0, i);
				if (before.some(({ envelope: { n } }) => n >= entry.n)) {
					apart++;
					return;
				}
				const keys = new Set(keysOf(id, holesOf(entry)));
				const holes = foldSeam(id, before).holes.filter((hole) =>
					keys.has(holeKey(hole.by, hole.index))
				);
				expect(entry.on).toEqual(headsAt(holes));
			});
		expect(apart).toBeGreaterThan(1);
	});

	it('plans as many seams as asked for, the plan over and over', () => {
		const { entries } = generateLog({ seams: 300, evenings: 1 });
		const names = entries.flatMap((entry) =>
			entry.kind === 'seam.planned' ? [entry.body.name] : []
		);
		expect(names).toHaveLength(300);
		expect(names[0]).toBe('Front spar: web to caps');
		expect(names[130]).toBe('Front spar: web to caps 2');
	});

	it('finishes the plan when there are evenings enough', () => {
		const log = generateLog({ seams: 12, evenings: 400 });
		const states = [...bySeam(log)].flatMap(([id, lines]) =>
			foldSeam(id, lines).holes.map(({ state }) => state)
		);
		expect(states).not.toContain('open');
		const evenings = log.entries.filter(({ kind }) => kind === 'time.worked').length;
		expect(evenings).toBeLessThan(100);
	});

	it('is written by the people and devices given, under the keys given', () => {
		const { members, devices } = generateLog({ entries: 1 });
		const key = 'B'.repeat(87);
		const log = generateLog({
			seed: 'other',
			entries: 500,
			people: members,
			devices,
			keyOf: () => key
		});
		expect(log.devices).toEqual(devices);
		const ids = new Set(devices.map(({ id }) => id));
		expect(log.entries.every(({ device }) => ids.has(device))).toBe(true);
		const enrolled = log.entries.filter(({ kind }) => kind === 'device.enrolled');
		expect(enrolled.map(({ body }) => (body as { key: string }).key)).toEqual(
			devices.map(() => key)
		);
		expect(() => generateLog({ people: members, devices: devices.slice(1) })).toThrow(RangeError);
	});

	it('works for one person alone', () => {
		expectAcceptable(generateLog({ entries: 800, people: 1, devices: 1 }));
	});
});
