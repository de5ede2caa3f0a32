import { describe, expect, it } from 'vitest';
import { ANA, ASSEMBLY, BUILD, idOf, Scribe } from '../../../tests/support/scribe';
import { canonicalText, hashText, type Json } from './bytes';
import { MOST_BYTES, readEntry, references, writeEntry, type Entry } from './entry';
import { KINDS } from './kinds';
import { REFUSALS } from './refusals';

const scribe = new Scribe();
const seam = idOf(7);
const good = scribe.entry(
	'holes.driven',
	{ holes: [{ from: 1, to: 5 }], method: 'driven' },
	{ seam }
);

/** What is said of the good entry with something changed. */
function said(change: Record<string, unknown>): string {
	const reading = readEntry(canonicalText({ ...good, ...change }));
	return reading.ok ? 'ok' : reading.code;
}

describe('an entry', () => {
	it('reads as it was written, and its hash is that of its text', () => {
		const reading = writeEntry(good);
		expect(reading).toMatchObject({ ok: true, entry: good });
		if (reading.ok) expect(reading.hash).toBe(hashText(reading.text));
	});

	/** Frozen: a change here breaks every hash, seal and sign-off ever made. */
	it('has the bytes and the hash it had when the format was frozen', () => {
		const reading = writeEntry(good);
		expect(reading.ok && reading.text).toBe(
			'{"at":"2026-03-14T20:15:00.000+01:00","author":"01900000-0000-7000-8000-0000000000a0","body":{"holes":[{"from":1,"to":5}],"method":"driven"},"build":"01900000-0000-7000-8000-000000000001","device":"01900000-0000-7000-8000-0000000000d0","id":"01900000-0000-7000-8000-0000000003e8","kind":"holes.driven","n":1,"on":[],"seam":"01900000-0000-7000-8000-000000000007","v":1}'
		);
		expect(reading.ok && reading.hash).toBe('4Y3DdAa71_eZnyRy7vyoGsEdehLV3Xqt-l-Ekice8wk');
	});

	it('is refused for text that is not its one canonical form', () => {
		const text = canonicalText(good);
		for (const other of [
			` ${text}`,
			text.replace('"n":1', '"n":1.0'),
			text.replace('{', '{"n":1,'),
			'{',
			'null',
			'[]',
			'"x"'
		])
			expect(readEntry(other), other).toMatchObject({ ok: false });
		expect(readEntry(text.replace('"n":1', '"n":1e0'))).toMatchObject({
			code: 'entry.not_canonical'
		});
	});

	it.each<[string, Record<string, unknown>, string]>([
		['a field nobody knows', { extra: 1 }, 'entry.unknown_field'],
		[
			'a field of the body nobody knows',
			{ body: { ...good.body, extra: 1 } },
			'entry.unknown_field'
		],
		['a kind nobody knows', { kind: 'holes.painted' }, 'entry.unknown_kind'],
		['a version nobody knows', { v: 2 }, 'entry.unknown_kind'],
		['an id that is no UUID v7', { id: '6fa459ea-ee8a-4ca4-894e-db77e160355e' }, 'entry.malformed'],
		['n of nought', { n: 0 }, 'entry.malformed'],
		['a body that is none', { body: 'x' }, 'entry.malformed'],
		[
			'holes backwards',
			{ body: { holes: [{ from: 5, to: 1 }], method: 'driven' } },
			'entry.malformed'
		],
		[
			'holes twice',
			{
				body: {
					holes: [
						{ from: 1, to: 5 },
						{ from: 5, to: 6 }
					],
					method: 'driven'
				}
			},
			'entry.malformed'
		],
		[
			'ranges that are one',
			{
				body: {
					holes: [
						{ from: 1, to: 5 },
						{ from: 6, to: 7 }
					],
					method: 'driven'
				}
			},
			'entry.malformed'
		],
		['causes out of order', { on: [idOf(9), idOf(8)] }, 'entry.malformed'],
		['a day that is none', { at: '2026-02-30T20:00:00.000+01:00' }, 'entry.malformed'],
		['a leap day that is none', { at: '2100-02-29T20:00:00.000+01:00' }, 'entry.malformed'],
		['an hour that is none', { at: '2026-02-03T24:00:00.000+01:00' }, 'entry.malformed'],
		['a year before aeroplanes', { at: '0000-01-01T01:00:00.000+01:00' }, 'entry.malformed'],
		['a month that is none', { when: { is: 'about', date: '2026-13' } }, 'entry.malformed'],
		['half a date', { when: { is: 'about', date: '2026-' } }, 'entry.malformed'],
		['n beyond 2^52', { n: 2 ** 52 + 1 }, 'entry.malformed'],
		['no seam', { seam: undefined }, 'entry.concerns'],
		['an assembly beside the seam', { assembly: ASSEMBLY }, 'entry.concerns'],
		['the id of its own seam', { id: seam }, 'entry.identity'],
		['the id of the build', { id: BUILD }, 'entry.identity']
	])('is refused with %s', (_, change, code) => {
		const cleaned = Object.fromEntries(
			Object.entries({ ...good, ...change }).filter(([, value]) => value !== undefined)
		);
		expect(readEntry(canonicalText(cleaned as Json))).toMatchObject({ ok: false, code });
	});

	it.each(['2024-02-29', '2026-12', '2026'])('may be about %s', (date) => {
		expect(said({ when: { is: 'about', date } })).toBe('ok');
	});

	it('keeps the envelope of a kind of a newer app, to be passed on unharmed', () => {
		const reading = readEntry(
			canonicalText({
				...good,
				kind: 'holes.painted',
				v: 7,
				body: { colour: 'x' }
			})
		);
		expect(reading).toMatchObject({
			ok: false,
			envelope: { id: good.id, kind: 'holes.painted', seam }
		});
	});

	it('is refused past 32 KiB, counted in bytes, and a sign-off past 256 KiB', () => {
		const note = (text: string) => scribe.read('note.written', { text }, { seam });
		expect(note('a'.repeat(4000)).ok).toBe(true);
		const changed = (size: number) =>
			said({
				kind: 'seam.changed',
				body: { points: Array.from({ length: size }, () => 12_345_678_901) }
			});
		expect(changed(1600)).toBe('ok');
		expect(MOST_BYTES).toBe(32_768);
		const covers = (count: number) =>
			readEntry(
				canonicalText({
					...scribe.entry(
						'inspection.signed',
						{
							verdict: 'in_order',
							covers: Array.from({ length: count }, (_, i) => idOf(i)),
							digest: hashText(''),
							link: { seq: 1, link: hashText('') },
							name: 'I. Inspector',
							statement: 'seen'
						},
						{ seam }
					)
				})
			);
		expect(covers(5500).ok).toBe(true);
		const steps = Object.fromEntries(
			Array.from({ length: 100 }, (_, i) => [idOf(i), { text: 'x'.repeat(400) }])
		);
		expect(scribe.read('assembly.changed', { steps }, { assembly: ASSEMBLY })).toMatchObject({
			code: 'entry.too_large'
		});
		expect(readEntry('"' + 'é'.repeat(140_000) + '"')).toMatchObject({ code: 'entry.too_large' });
	});

	it('tidies what people type and refuses the same untidy text from outside', () => {
		const typed = { ...good, body: { ...good.body, note: 'Ame\u0301lie' } } as Entry;
		expect(writeEntry(typed)).toMatchObject({ ok: true, entry: { body: { note: 'Am\u00e9lie' } } });
	});

	it('that makes a build, an assembly or a seam carries its id', () => {
		const id = idOf(77);
		const plan = { name: 'Rib', assembly: ASSEMBLY, holes: { count: 4, first: 1 } };
		expect(scribe.read('seam.planned', plan, { id, seam: id }).ok).toBe(true);
		expect(scribe.read('seam.planned', plan, { id, seam })).toMatchObject({
			code: 'entry.identity'
		});
		expect(scribe.read('build.opened', { name: 'Yarrow Two' }, { id })).toMatchObject({
			code: 'entry.identity'
		});
		expect(scribe.read('build.opened', { name: 'Yarrow Two' }, { id: BUILD }).ok).toBe(true);
	});

	it('names everything it refers to', () => {
		const [setup, added] = [idOf(50), idOf(51)];
		const entry = scribe.entry(
			'holes.driven',
			{ holes: [{ by: added, from: 1, to: 2 }], method: 'driven', setup },
			{ seam }
		);
		expect(references(entry)).toEqual({ bound: [added, seam], loose: [setup] });
	});

	it('of every kind has traits, and the follower writes only what design allows', () => {
		const writers = Object.entries(KINDS).filter(([, kind]) => kind.writer === 'follower');
		expect(writers.map(([name]) => name)).toEqual([
			'device.enrolled@1',
			'note.written@1',
			'photo.taken@1',
			'entry.struck@1'
		]);
		expect(Object.values(REFUSALS).every(({ says }) => says.endsWith('.'))).toBe(true);
		expect(good.author).toBe(ANA);
	});
});
