/** The first day: the build is opened, the crew comes in, and what was done on paper is written down. */
import { found, limitsFor } from './faults';
import type { Device } from './crew';
import type { Shop } from './shop';

/**
 * @param keyOf public key of each device
 * @param crewLines also writes what the server would: the owner and each member joining, on a device of its own
 */
export function open(
	shop: Shop,
	name: string,
	keyOf: (device: Device, index: number) => string,
	crewLines: boolean
): void {
	const { pen, owner, devices, members } = shop;
	const enrol = (device: Device, index: number) =>
		pen.write(device, 'device.enrolled', { key: keyOf(device, index), name: device.name });
	const opened = pen.write(owner, 'build.opened', {
		name,
		about: 'Two seats, low wing, all aluminium. An invented aeroplane.',
		units: 'in',
		place: 'Hangar 7, the cold end'
	});
	enrol(owner, 0);
	if (crewLines) {
		const server = { id: pen.newId('server'), person: owner.person, name: 'server' };
		enrol(server, devices.length);
		for (const { id, role } of members) {
			pen.wait(10, 60);
			pen.write(server, 'crew.joined', { person: id, role });
		}
	}
	devices.slice(1).forEach((device, i) => {
		pen.wait(20, 120);
		enrol(device, i + 1);
	});
	pen.write(
		owner,
		'build.described',
		{ about: 'Two seats, low wing, all aluminium. An invented aeroplane, not a design.' },
		{ on: [opened] }
	);
	pen.wait(20, 60);
	shop.helpers.push(
		pen.write(owner, 'person.named', { name: 'Rowan', note: 'Neighbour, bucks on Saturdays' })
	);
	practise(shop);
}

/** Whoever is new shoots thirty good heads before the first real one. */
function practise(shop: Shop): void {
	const { pen, owner } = shop;
	const callout = 'MS20470AD4-4';
	const [learner] = shop.devicesIn('builder');
	if (!learner) return;
	pen.wait(60, 200);
	const task = pen.write(owner, 'practice.set', { person: learner.person, callout, heads: 30 });
	for (let strip = 0; strip < 3; strip++) {
		pen.wait(300, 900);
		pen.write(learner, 'practice.logged', {
			person: learner.person,
			callout,
			limits: limitsFor(callout),
			heads: Array.from({ length: 10 }, () => ({
				found: found(shop, callout, pen.random.chance(0.3 - strip / 10) ? 'over_driven' : undefined)
			})),
			drilledOut: 2,
			task
		});
	}
}

/** The first seam and part of the second were driven before this log began. */
export function startOnPaper({ pen, owner, queue }: Shop): void {
	queue.slice(0, 2).forEach((seam, i) => {
		const { count } = seam.plan.body.holes;
		seam.holes = Array.from({ length: count }, (_, at) => ({ index: at + 1, heads: [] }));
		seam.started = true;
		seam.next = i === 0 ? count : Math.floor(count / 2);
		const driven = seam.holes.slice(0, seam.next);
		if (driven.length === 0) return;
		pen.wait(30, 90);
		pen.hold(
			owner,
			'holes.driven',
			seam.id,
			driven,
			{ method: 'not_recorded', callout: seam.plan.body.callout },
			{ when: { is: 'before', source: `paper page ${12 + i}` } }
		);
	});
}
