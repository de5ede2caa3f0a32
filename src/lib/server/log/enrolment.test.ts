import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { hashText } from '$lib/logbook/bytes';
import {
	enrol,
	makeDevice,
	openBuild,
	planSeam,
	sealLines,
	writeLine
} from '../../../../tests/support/people';
import { outcomes, TestLogServer } from '../../../../tests/support/log-server';
import { removeMember } from './crew';
import { decideQuarantine, listQuarantine } from './quarantine';

let server: TestLogServer;
beforeAll(async () => {
	server = await TestLogServer.make();
});
afterAll(() => server.close());

async function accept(owner: string, build: string, ids: string[]) {
	const answer = await decideQuarantine(server, owner, build, { ids, decision: 'accept' });
	return typeof answer === 'string' ? answer : outcomes(answer.results);
}

describe('an owner', () => {
	it('cannot sign in the name of an inspector with a key of the owner’s own making', async () => {
		const owner = await server.makePerson('Olga');
		const ines = await server.makePerson('Ines');
		const { build, opened, enrolled } = openBuild(owner);
		const plan = planSeam(owner, build);
		await server.push(owner, build, [opened, enrolled, ...plan.lines]);
		await server.admit(owner, build, ines, 'inspector');
		const fake = { ...(await makeDevice(ines.author)), n: 40 };
		const first = enrol(fake, build);
		const verdict = writeLine(
			fake,
			build,
			'inspection.signed',
			{
				verdict: 'in_order',
				covers: [],
				digest: hashText(''),
				link: { seq: 1, link: hashText('') },
				name: 'Ines',
				statement: 'Seen and in order.'
			},
			{ seam: plan.seam }
		);
		const seals = [await sealLines(fake, build, [first, verdict])];
		expect(await server.offer(owner, build, [first], { seals })).toEqual([
			'refused device.carried'
		]);
		const list = await listQuarantine(server, owner.author, build);
		expect(list).toMatchObject({ lines: [{ id: first.id, acceptable: false }] });
		expect(await accept(owner.author, build, [first.id])).toEqual([
			'refused quarantine.not_acceptable'
		]);
		expect(await server.offer(owner, build, [verdict], { seals })).toEqual([
			'refused entry.referent_refused'
		]);
		expect(await accept(owner.author, build, [verdict.id])).toEqual([
			'pending entry.referent_refused'
		]);
	});

	it('takes no device in that another build knows with another key', async () => {
		const bea = await server.makePerson('Bea');
		const mal = await server.makePerson('Mal');
		const own = openBuild(bea);
		await server.push(bea, own.build, [own.opened, own.enrolled]);
		const other = openBuild(mal);
		await server.push(mal, other.build, [other.opened, other.enrolled]);
		const finn = await server.makePerson('Finn');
		await server.admit(mal, other.build, finn, 'builder');
		await removeMember(server, mal.author, other.build, finn.author);
		// Waits for the owner as Finn's; meanwhile the device turns out to be another's.
		const fake = { ...(await makeDevice(finn.author)), device: (await makeDevice()).device, n: 40 };
		const first = enrol(fake, other.build);
		expect(await server.offer(fake, other.build, [first])).toEqual(['refused crew.removed']);
		const phone = { ...(await makeDevice(bea.author)), device: fake.device, n: 40 };
		expect(await server.offer(phone, own.build, [enrol(phone, own.build)])).toEqual(['accepted']);
		expect(await accept(mal.author, other.build, [first.id])).toEqual([
			'refused device.enrolled_before'
		]);
	});

	it('takes in the enrolment that a removed member brought in their own session, whoever offers it again', async () => {
		const { build, owner, builder, inspector } = await server.makeCrew();
		const phone = { ...(await makeDevice(builder.author)), n: 40 };
		const first = enrol(phone, build);
		const seals = [await sealLines(phone, build, [first])];
		await server.offer(inspector, build, [first], { seals });
		await removeMember(server, owner.author, build, builder.author);
		expect(await server.offer(builder, build, [first], { seals })).toEqual([
			expect.stringContaining('crew.removed')
		]);
		await server.offer(inspector, build, [first], { seals });
		expect(await accept(owner.author, build, [first.id])).toEqual(['accepted']);
	});
});
