/**
 * A server with a crew of four and a build that a seeded year of work has filled, for the audit of the screens. Taken in
 * by vite (`load.ts`), which knows how to read what the generator is made of.
 */
import { generateLog } from '$lib/example/generate';
import { canonicalText, hashText, tidy } from '$lib/logbook/bytes';
import type { Role } from '$lib/logbook/kinds';
import { Caller } from '../support/caller';
import {
	driveHoles,
	makeDevice,
	makeId,
	openBuild,
	sealedPush,
	sealLines,
	writeLine,
	type TestDevice,
	type TestLine
} from '../support/people';

/** Somebody with an account; the cookie, `name=value`, signs them in. */
export interface Account {
	readonly email: string;
	readonly cookie: string;
}

export interface Filled {
	readonly crew: Readonly<Record<Role, Account>>;
	/** Somebody in no crew, who has no build. */
	readonly newcomer: Account;
	readonly build: string;
	/** Another build of the same crew, with nothing in it. */
	readonly empty: string;
	/** An assembly, and a seam of it in which everything is found: driven, open, defects, left open, two to settle. */
	readonly assembly: string;
	readonly seam: string;
	/** A line of that seam on which others stand. */
	readonly line: string;
}

const SEAM = { name: 'Skin to spar, lower', holes: 64 };

const NAMES: Readonly<Record<Role, string>> = {
	owner: 'ana',
	builder: 'jo',
	inspector: 'piet',
	follower: 'sam'
};
/** The order in which the generator makes its crew: the first is the owner. */
const ROLES = ['owner', 'builder', 'inspector', 'follower'] as const;
/** As many as a push takes. */
const MOST = 200;

interface Member extends Account {
	readonly caller: Caller;
	readonly id: string;
	readonly name: string;
	readonly device: TestDevice;
}

/** How much the generated year is to be. */
export interface Size {
	readonly entries: number;
	readonly seams: number;
}

export async function fill(server: { readonly url: string }, size: Size): Promise<Filled> {
	const crew = {
		owner: await member(server, NAMES.owner),
		builder: await member(server, NAMES.builder),
		inspector: await member(server, NAMES.inspector),
		follower: await member(server, NAMES.follower)
	};
	const newcomer = await member(server, 'nell');
	const { owner, follower } = crew;

	const { build, lines } = await year(crew, size);
	const { assembly, seam, line, written } = seamOfEverything(crew, build);
	await carry(owner, build, [...lines, ...written], Object.values(crew));

	// What a follower may not write waits for the owner.
	await push(follower, build, [
		driveHoles(follower.device, build, seam, 30, 34),
		driveHoles(follower.device, build, seam, 40)
	]);

	const bare = openBuild(owner.device, 'Yarrow Three');
	await push(owner, bare.build, [bare.opened, bare.enrolled]);
	await admit(crew, bare.build);
	return { crew, newcomer, build, empty: bare.build, assembly, seam, line };
}

async function member(server: { readonly url: string }, name: string): Promise<Member> {
	const caller = await Caller.registered(server, name);
	const person = await caller.person();
	if (!person) throw new Error(`${name} is not signed in`);
	const { id, email } = person;
	return { caller, id, name, email, cookie: caller.cookie, device: await makeDevice(id) };
}

type Crew = Readonly<Record<Role, Member>>;

async function admit({ owner, ...others }: Crew, build: string): Promise<void> {
	for (const role of ROLES) {
		if (role === 'owner') continue;
		await owner.caller.api(owner.id, `builds/${build}/crew`, { email: others[role].email, role });
	}
}

/** The generated year, its crew admitted and their devices known to the server; the rest of it is still to be pushed. */
async function year(crew: Crew, size: Size) {
	const members = ROLES.map((role) => ({ role, ...crew[role] }));
	const log = generateLog({
		seed: 'audit',
		name: 'Yarrow Two',
		...size,
		people: members.map(({ id, name, role }) => ({ id, name, role })),
		devices: members.map(({ id, name, device }) => ({
			id: device.device,
			person: id,
			name: `${name}’s phone`
		})),
		keyOf: (_, i) => members[i]?.device.publicKey ?? ''
	});
	const known = log.entries.filter(
		({ kind }) => kind === 'build.opened' || kind === 'device.enrolled'
	);
	const lineOf = (entry: (typeof known)[number]): TestLine & { readonly device: string } => {
		const text = canonicalText(tidy(entry));
		return { id: entry.id, n: entry.n, device: entry.device, text, hash: hashText(text) };
	};
	for (const { role, device } of members) {
		const own = known.filter((entry) => entry.device === device.device).map(lineOf);
		await push(crew[role], log.build, own);
		if (role === 'owner') await admit(crew, log.build);
		device.n = log.entries.length + 100;
	}
	const lines = log.entries.filter((entry) => !known.includes(entry)).map(lineOf);
	return { build: log.build, lines };
}

/** A seam worked on by two phones that did not know of each other, with defects and holes left open. */
function seamOfEverything({ owner, builder }: Crew, build: string) {
	const [assembly, seam] = [makeId(), makeId()];
	const { device } = owner;
	const about = { seam };
	const planned = writeLine(
		device,
		build,
		'assembly.planned',
		{ name: 'Left elevator', order: 1 },
		{ id: assembly, assembly }
	);
	const plan = writeLine(
		device,
		build,
		'seam.planned',
		{
			name: SEAM.name,
			assembly,
			holes: { count: SEAM.holes, first: 1 },
			callout: 'MS20426AD3-3.5',
			endOne: 'inboard',
			endLast: 'tip'
		},
		{ id: seam, ...about }
	);
	const run = driveHoles(device, build, seam, 1, 12);
	const own = [
		planned,
		plan,
		run,
		writeLine(
			device,
			build,
			'defect.noted',
			{ holes: [{ from: 3, to: 3 }], fault: 'smile', note: 'Light, seen under the lamp.' },
			{ ...about, on: [run.id] }
		),
		writeLine(
			device,
			build,
			'defect.noted',
			{ holes: [{ from: 7, to: 8 }], fault: 'tipped' },
			{ ...about, on: [run.id] }
		),
		writeLine(
			device,
			build,
			'holes.left_open',
			{ holes: [{ from: 15, to: 16 }], reason: 'the bar does not go in', closedBy: 'a screw' },
			about
		),
		writeLine(
			device,
			build,
			'holes.drilled_out',
			{ holes: [{ from: 10, to: 10 }] },
			{ ...about, on: [run.id] }
		)
	];
	builder.device.n = device.n;
	const twice = driveHoles(builder.device, build, seam, 12, 14);
	const written = [
		...own.map((line) => ({ ...line, device: device.device })),
		{ ...twice, device: builder.device.device }
	];
	// Both changed the plan.
	for (const { device: of } of [owner, builder]) {
		of.n = Math.max(device.n, of.n) + 1;
		const endLast = of === device ? 'tip rib' : 'tip';
		const changed = writeLine(of, build, 'seam.changed', { endLast }, { ...about, on: [seam] });
		written.push({ ...changed, device: of.device });
	}
	return { assembly, seam, line: run.id, written };
}

async function push(of: Member, build: string, lines: readonly TestLine[]): Promise<void> {
	await of.caller.push(of.id, build, await sealedPush(of.device, build, lines));
}

/** Pushes lines of several devices from one of them, each line under a seal of its own device. */
async function carry(
	carrier: Member,
	build: string,
	lines: readonly (TestLine & { readonly device: string })[],
	crew: readonly Member[]
): Promise<void> {
	for (let at = 0; at < lines.length; at += MOST) {
		const some = lines.slice(at, at + MOST);
		const seals = [];
		for (const { device } of crew) {
			if (device === carrier.device) continue;
			const theirs = some.filter((line) => line.device === device.device);
			if (theirs.length > 0) seals.push(await sealLines(device, build, theirs));
		}
		const request = await sealedPush(carrier.device, build, some, { seals });
		const { results } = await carrier.caller.push(carrier.id, build, request);
		const refused = results.find(({ status }) => status !== 'accepted');
		if (refused) throw new Error(`not accepted: ${JSON.stringify(refused)}`);
	}
}
