import { describe, expect, it } from 'vitest';
import { ANA, idOf, JO, Scribe } from '../../../tests/support/scribe';
import { judge, N_LEAP, type Log } from './judge';
import type { Role } from './kinds';
import { KINDS } from './kinds';
import { mayWrite } from './permission';
import type { Entry } from './entry';

const DEVICES = new Map([
	[idOf(0xd0), ANA],
	[idOf(0xd1), JO]
]);

/** A log that knows these lines, with Ana and Jo in these roles. */
function logOf(
	scribe: Scribe,
	ana: Role | 'left' = 'owner',
	jo: Role | 'left' | undefined = 'builder',
	quarantined: string[] = []
): Log {
	const known = new Map(scribe.lines.map((line) => [line.id, line.envelope]));
	return {
		role: (person) => (person === ANA ? ana : person === JO ? jo : undefined),
		find: (id) => known.get(id),
		isQuarantined: (id) => quarantined.includes(id),
		enrolledFor: (device) => DEVICES.get(device),
		maxN: 100
	};
}

function scene() {
	const scribe = new Scribe();
	scribe.write('assembly.planned', { name: 'Left wing' }, { id: idOf(2), assembly: idOf(2) });
	const seam = scribe.seam(10);
	const run = (options: object = {}) =>
		scribe.entry(
			'holes.driven',
			{ holes: [{ from: 1, to: 5 }], method: 'driven' },
			{ seam, n: 50, ...options }
		);
	return { scribe, seam, run };
}

describe('a line that reaches the log', () => {
	it('is accepted when its author may write it and everything it refers to is there', () => {
		const { scribe, run } = scene();
		expect(judge(run(), logOf(scribe))).toEqual({ verdict: 'accept' });
	});

	it.each<
		[string, object, Parameters<typeof logOf> extends [unknown, ...infer R] ? R : never, string]
	>([
		['by a stranger', { author: idOf(0xa9), device: idOf(0xd9) }, [], 'entry.author_unknown'],
		['by somebody who left', { author: JO }, ['owner', 'left'], 'crew.removed'],
		['by a follower', { author: JO }, ['owner', 'follower'], 'entry.role'],
		['from a device nobody enrolled', { device: idOf(0xd9) }, [], 'device.unknown'],
		[
			'from a device of somebody else',
			{ author: JO, device: idOf(0xd0) },
			[],
			'device.other_person'
		],
		['numbered far beyond the log', { n: 101 + N_LEAP }, [], 'entry.n_too_far']
	])('%s is refused', (_, options, log, code) => {
		const { scribe, run } = scene();
		expect(judge(run(options), logOf(scribe, ...log))).toEqual({ verdict: 'refuse', code });
	});

	it('waits for what it refers to, and shares the fate of what was refused', () => {
		const { scribe, run } = scene();
		const missing = idOf(0x999);
		const entry = { ...run(), on: [missing] } as Entry;
		expect(judge(entry, logOf(scribe))).toEqual({ verdict: 'hold', waitsFor: missing });
		expect(judge(entry, logOf(scribe, 'owner', 'builder', [missing]))).toEqual({
			verdict: 'refuse',
			code: 'entry.referent_refused'
		});
	});

	it('may not stand on what was written after it, or on a line of another seam', () => {
		const { scribe, run, seam } = scene();
		const later = scribe.drive(seam, 1, 5, { n: 60 });
		expect(judge(run({ on: [later] }), logOf(scribe))).toMatchObject({
			code: 'entry.reference_forward'
		});
		const elsewhere = scribe.drive(scribe.seam(5), 1, 2);
		expect(judge(run({ on: [elsewhere] }), logOf(scribe))).toMatchObject({
			code: 'entry.reference_elsewhere'
		});
	});

	it('may use a setup that was made on another seam', () => {
		const { scribe, seam } = scene();
		const setup = scribe.write('setup.made', { gun: '3X' }, { seam: scribe.seam(5) });
		const entry = scribe.entry(
			'holes.driven',
			{ holes: [{ from: 1, to: 1 }], method: 'driven', setup: setup.id },
			{ seam, n: 70 }
		);
		expect(judge(entry, logOf(scribe))).toEqual({ verdict: 'accept' });
	});

	it('that only the server writes is refused from everybody', () => {
		const { scribe } = scene();
		const entry = scribe.entry('crew.role', { person: JO, role: 'owner' }, { n: 50 });
		expect(judge(entry, logOf(scribe))).toEqual({ verdict: 'refuse', code: 'entry.server_only' });
	});

	it('strikes one’s own; the owner any but a verdict; a verdict only its signer', () => {
		const { scribe, seam } = scene();
		const anas = scribe.drive(seam, 1, 1);
		const jos = scribe.drive(seam, 2, 2, { author: JO });
		const verdict = scribe.write(
			'inspection.signed',
			{
				verdict: 'in_order',
				covers: [],
				digest: 'A'.repeat(43),
				link: { seq: 0, link: 'A'.repeat(43) },
				name: 'J',
				statement: 'seen'
			},
			{ seam, author: JO }
		);
		const strike = (target: typeof anas, author: string, roles: [Role, Role]) =>
			judge(
				scribe.entry(
					'entry.struck',
					{ entry: target.id, reason: 'other' },
					{ seam, author, n: 90 }
				),
				logOf(scribe, ...roles)
			);
		expect(strike(jos, JO, ['owner', 'builder'])).toEqual({ verdict: 'accept' });
		expect(strike(anas, JO, ['owner', 'builder'])).toMatchObject({ code: 'strike.not_yours' });
		expect(strike(jos, ANA, ['owner', 'builder'])).toEqual({ verdict: 'accept' });
		expect(strike(verdict, ANA, ['owner', 'inspector'])).toMatchObject({ code: 'strike.verdict' });
		expect(strike(verdict, JO, ['owner', 'inspector'])).toEqual({ verdict: 'accept' });
		const planned = scribe.lines.find((line) => line.id === seam);
		expect(strike(planned ?? anas, ANA, ['owner', 'builder'])).toMatchObject({
			code: 'strike.not_strikable'
		});
	});
});

describe('permission', () => {
	/** design.md: "Builder: all but crew, owner, withdrawn, decided, waiver, verdict, close." */
	it('denies each role exactly what the design denies it', () => {
		const names = Object.keys(KINDS).map((name) => name.split('@')[0] as string);
		const denied = (role: Role) => names.filter((name) => !mayWrite(role, name));
		const server = [
			'crew.joined',
			'crew.role',
			'crew.left',
			'crew.bound',
			'owner.changed',
			'inspection.confirmed'
		];
		expect(denied('owner')).toEqual(
			names.filter((name) => [...server, 'inspection.signed'].includes(name))
		);
		const owners = ['build.opened', 'entry.withdrawn'];
		expect(denied('inspector')).toEqual(
			names.filter((name) => [...server, ...owners].includes(name))
		);
		const judging = [
			'defect.decided',
			'waiver.given',
			'inspection.signed',
			'inspection.refused',
			'assembly.closed'
		];
		expect(denied('builder')).toEqual(
			names.filter((name) => [...server, ...owners, ...judging].includes(name))
		);
		expect(names.filter((name) => mayWrite('follower', name))).toEqual([
			'device.enrolled',
			'note.written',
			'photo.taken',
			'entry.struck'
		]);
	});
});
