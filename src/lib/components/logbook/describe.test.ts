import { describe as group, expect, it } from 'vitest';
import { ANA, ASSEMBLY, idOf, JO, Scribe } from '../../../../tests/support/scribe';
import type { Body, Kind } from '$lib/logbook/kinds';
import { KINDS } from '$lib/logbook/kinds';
import { describe } from './describe';
import type { Names } from './names';

const SEAM = idOf(0x5ea);
const HASH = 'A'.repeat(43);
const names: Names = {
	person: (id) => (id === ANA ? 'Ana' : id === JO ? 'Jo' : 'somebody'),
	seam: () => 'Skin to spar',
	assembly: () => 'Left elevator',
	holeNumber: (_, by, index) => (by === undefined && index <= 64 ? index : undefined),
	line: () => 'driven 1–5'
};
const holes = [{ from: 27, to: 31 }];
const length = { nm: 4_000_000, unit: 'mm' as const };

/** One body of every kind, and what is said of it. */
const SAID: { [K in Kind]: readonly [Body<K>, string] } = {
	'build.opened': [{ name: 'Yarrow Two' }, 'build opened: Yarrow Two'],
	'build.described': [
		{ name: 'Yarrow', rules: { sampling: '1 in 10' } },
		'build described (name, rules) · Yarrow'
	],
	'crew.joined': [{ person: JO, role: 'builder' }, 'Jo joined the crew as builder'],
	'crew.role': [
		{ person: JO, role: 'inspector' },
		'Jo is Inspector (mechanic or mentor) from now on'
	],
	'crew.left': [{ person: JO, reason: 'moved' }, 'Jo left the crew · moved'],
	'crew.bound': [{ person: JO, author: ANA }, 'Jo is the author Ana of old lines'],
	'owner.changed': [{ from: ANA, to: JO }, 'Ana handed the build over to Jo'],
	'device.enrolled': [{ key: 'A'.repeat(87), name: 'phone' }, 'a device joined · phone'],
	'person.named': [{ name: 'Max' }, 'helper named: Max'],
	'assembly.planned': [{ name: 'Left elevator' }, 'assembly planned: Left elevator'],
	'assembly.changed': [{ name: 'x', note: null }, 'Left elevator: plan changed (name, note)'],
	'assembly.closed': [{}, 'Left elevator closed'],
	'assembly.reopened': [{ reason: 'antenna' }, 'Left elevator reopened · antenna'],
	'assembly.retired': [{}, 'Left elevator taken out of the plan'],
	'seam.planned': [
		{
			name: 'Skin to spar',
			assembly: ASSEMBLY,
			holes: { count: 64, first: 1 },
			callout: 'MS20426AD3-3.5'
		},
		'seam planned: Skin to spar · 64 holes · MS20426 AD 3-3.5'
	],
	'seam.changed': [{ callout: null, edge: length }, 'plan changed (callout, edge distance)'],
	'seam.retired': [{ reason: 'one piece now' }, 'seam taken out of the plan · one piece now'],
	'holes.added': [{ count: 3, first: 65 }, '3 holes added: 65–67'],
	'holes.retired': [{ holes }, '27–31 taken out of the plan'],
	'setup.made': [
		{ gun: '3X', pressure: { text: '40', unit: 'psi' }, shooter: ANA, bucker: JO },
		'setup · gun 3X · 40 psi · Ana shoots · Jo bucks'
	],
	'prep.done': [{ step: 'dimpled', holes }, 'dimpled 27–31'],
	'sealant.mixed': [
		{ product: 'B-2', mixedAt: '2026-03-14T20:15:00.000+01:00', minutes: 120 },
		'sealant mixed: B-2 · 120 min to use'
	],
	'bag.opened': [
		{ callout: 'MS20470AD4-4', lot: '7', markSeen: true },
		'bag opened: MS20470 AD 4-4 · lot 7 · head mark seen'
	],
	'strip.shot': [
		{ callout: 'MS20470AD4-4', heads: [{}, {}] },
		'practice strip: 2 heads · MS20470 AD 4-4'
	],
	'practice.logged': [
		{ person: JO, callout: 'MS20470AD4-4', heads: [{}], drilledOut: 1 },
		'practice of Jo: 1 head · MS20470 AD 4-4 · 1 drilled out'
	],
	'practice.set': [
		{ person: JO, callout: 'MS20470AD4-4', heads: 30 },
		'practice set for Jo: 30 heads · MS20470 AD 4-4'
	],
	'holes.driven': [
		{ holes, method: 'back_riveted', callout: 'MS20426AD3-3.5', shooter: ANA, bucker: JO },
		'back-riveted 27–31 · MS20426 AD 3-3.5 · Ana shoots · Jo bucks'
	],
	'holes.looked_at': [{ holes, by: JO }, 'Jo looked at 27–31'],
	'holes.left_open': [
		{ holes, reason: 'no bar fits', closedBy: 'a pulled rivet' },
		'left open 27–31 · no bar fits · closes with a pulled rivet'
	],
	'holes.drilled_out': [{ holes, reason: 'loose' }, 'drilled out 27–31 · loose'],
	'reading.taken': [
		{ what: { is: 'hole', index: 27 }, found: { by: 'caliper', width: length } },
		'hole 27 · 4 mm wide by caliper'
	],
	'defect.noted': [{ holes, fault: 'tipped', note: 'bar' }, 'defect 27–31: tipped · bar'],
	'defect.decided': [
		{ defect: idOf(9), holes, decision: 'leave', basis: 'manufacturer' },
		'decided on 27–31: leave as is · by the manufacturer'
	],
	'defect.fixed': [
		{ defect: idOf(9), holes, action: 'replaced_oversize' },
		'about the defect at 27–31: replaced, next size up'
	],
	'step.done': [{ step: idOf(9), value: { number: '25', unit: 'in-lb' } }, 'step done · 25 in-lb'],
	'closing.listed': [
		{
			items: [
				{ what: 'swarf', is: 'yes' },
				{ what: 'tools', is: 'no' }
			]
		},
		'closing list: 2 items · 1 not yet'
	],
	'waiver.given': [
		{ what: 'edge', holes, reason: 'by drawing' },
		'waiver: edge · 27–31 · by drawing'
	],
	'inspection.asked': [{ seams: [SEAM] }, 'inspection asked for · Skin to spar'],
	'inspection.signed': [
		{
			verdict: 'rework',
			covers: [],
			digest: HASH,
			link: { seq: 1, link: HASH },
			name: 'R. Vane',
			statement: 'seen',
			rework: holes
		},
		'signed by R. Vane: rework · rework 27–31'
	],
	'inspection.confirmed': [
		{ signed: idOf(9), means: 'password' },
		'sign-off confirmed by password'
	],
	'inspection.refused': [{ asked: idOf(9), reason: 'not mine' }, 'inspection refused · not mine'],
	'note.written': [{ text: '6 °C in the hangar', holes }, 'note on 27–31 · 6 °C in the hangar'],
	'photo.taken': [
		{ file: HASH, bytes: 1, type: 'image/jpeg', width: 1, height: 1, caption: 'spar' },
		'photo · spar'
	],
	'voice.recorded': [{ file: HASH, bytes: 1, type: 'audio/ogg', seconds: 12 }, 'voice, 12 s'],
	'time.worked': [
		{ people: [ANA, JO], day: '2026-03-14', minutes: 150 },
		'worked 2 h 30 min on 2026-03-14 · Ana, Jo'
	],
	'stock.counted': [
		{ callout: 'MS20470AD4-4', is: 'bought', pieces: 500 },
		'bought 500 pieces · MS20470 AD 4-4'
	],
	'entry.withdrawn': [
		{ entry: idOf(9), ground: 'law' },
		'withdrew the words of: driven 1–5 · required by law'
	],
	'entry.struck': [
		{ entry: idOf(9), reason: 'logged_twice', keeps: idOf(8) },
		'struck: driven 1–5 · logged twice · keeps: driven 1–5'
	]
};

group('a line in words', () => {
	const kinds = Object.keys(SAID) as Kind[];
	it('there is a sentence for every kind', () => {
		expect(kinds.map((kind) => `${kind}@1`).sort()).toEqual(Object.keys(KINDS).sort());
	});
	it.each(kinds)('%s', (kind) => {
		const [body, said] = SAID[kind];
		const line = new Scribe().write(kind, body, concerns(kind));
		expect(line.entry, 'the body must be one the log takes').toBeDefined();
		expect(describe(line, names)).toBe(said);
	});

	it('holes nobody planned are counted, not numbered', () => {
		const line = new Scribe().drive(SEAM, 64, 66);
		expect(describe(line, names)).toBe('driven 64 and 2 holes outside the plan');
	});
	it('a line of a newer app and a withdrawn one say so', () => {
		const { envelope, id } = new Scribe().drive(SEAM, 1, 1);
		expect(describe({ id, envelope, unreadable: 'newer_app' }, names)).toContain('newer app');
		expect(describe({ id, envelope, unreadable: 'withdrawn' }, names)).toContain('withdrawn');
		expect(describe({ id, envelope, unreadable: 'broken' }, names)).toContain('cannot be read');
	});
});

/** What a line of this kind concerns, and the id it carries where it makes something. */
function concerns(kind: Kind): { seam?: string; assembly?: string; id?: string } {
	switch (kind) {
		case 'build.opened':
			return { id: idOf(1) };
		case 'seam.planned':
			return { id: SEAM, seam: SEAM };
		case 'assembly.planned':
			return { id: ASSEMBLY, assembly: ASSEMBLY };
	}
	switch (KINDS[`${kind}@1`].concerns) {
		case 'seam':
		case 'any':
			return { seam: SEAM };
		case 'assembly':
			return { assembly: ASSEMBLY };
		case 'build':
			return {};
	}
}
