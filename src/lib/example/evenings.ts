/** What a crew does in an evening: sets up, drives, looks, and goes home. */
import type { Body, SeamOverride } from '$lib/logbook/kinds';
import { found, limitsFor, noteDefect, read } from './faults';
import type { Apart, Hole } from './pen';
import { overrideAt, thirtySeconds, type Crew, type Seam, type Shop } from './shop';
import { ask, BETWEEN_VISITS, closeIfReady, visit } from './visits';
import { BARS, CHANGES, CHEERS, LEFT_OPEN, NOTES, TOOLS } from './words';

type Driven = Body<'holes.driven'>;

/** What is at hand for a run, and stays until the rivet, the method or the crew changes. */
interface AtHand {
	readonly key: string;
	readonly setup: string;
}

export class Evenings {
	readonly #shop: Shop;
	#atHand: AtHand | undefined;
	/** Bags open, by callout, with the rivets left in each. */
	readonly #bags = new Map<string, { readonly id: string; left: number }>();
	/** Sealant mixed tonight. */
	#sealant: string | undefined;
	#lots = 0;

	constructor(shop: Shop) {
		this.#shop = shop;
	}

	/**
	 * One evening.
	 * @param day days since 1970, where the example is built
	 * @param goal rivets to drive before everybody goes home
	 */
	spend(day: number, goal: number): void {
		const shop = this.#shop;
		const { pen } = shop;
		const { random } = pen;
		shop.evening++;
		pen.clock = pen.localTime(day, 19 * 60 + random.between(0, 50));
		this.#atHand = undefined;
		this.#sealant = undefined;
		const crew = this.#whoIsThere();
		const began = pen.clock;
		shop.doWhatIsDue();
		const end = pen.localTime(day, 22 * 60 + 30);
		const touched = new Set<Seam>();
		let driven = 0;
		// Sealant keeps nobody waiting: some evenings go to whatever is driven wet.
		const wet = shop.evening > 40 && random.chance(0.12);
		while (driven < goal && pen.clock < end) {
			const seam = this.#next(wet, crew);
			if (!seam) break;
			touched.add(seam);
			driven += this.#workOn(seam, crew);
		}
		for (const seam of touched) this.#lookAt(seam, crew);
		for (const assembly of shop.finished) closeIfReady(shop, assembly);
		this.#goHome(crew, day, began);
		if (shop.evening % BETWEEN_VISITS === 0) {
			pen.clock = pen.localTime(day + 1, 10 * 60 + random.between(0, 60));
			visit(shop);
		}
	}

	/** Nobody drives alone what takes two. */
	#next(wet: boolean, { bucker }: Crew): Seam | undefined {
		const { queue } = this.#shop;
		const can = ({ plan }: Seam) => bucker !== undefined || plan.body.people !== 2;
		return (
			(wet && queue.find((seam) => seam.plan.body.sealing === 'wet' && can(seam))) ||
			queue.find(can)
		);
	}

	#whoIsThere(): Crew {
		const shop = this.#shop;
		const { random } = shop.pen;
		const builders = shop.devicesIn('owner', 'builder') as [Crew['device'], ...Crew['device'][]];
		const device = random.chance(0.5) ? shop.owner : random.pick(builders);
		const shooter = random.chance(0.75) ? device.person : random.pick(builders).person;
		const others = [
			...new Set(builders.map(({ person }) => person).filter((person) => person !== shooter)),
			...shop.helpers
		];
		const bucker = random.chance(0.9) ? others[random.between(0, others.length - 1)] : undefined;
		return { device, shooter, bucker };
	}

	/** One thing done on a seam. @returns rivets driven */
	#workOn(seam: Seam, crew: Crew): number {
		const { pen } = this.#shop;
		const { random } = pen;
		if (!seam.started) this.#begin(seam, crew);
		const [holes, override] = this.#take(seam);
		if (holes.length === 0) {
			this.#finish(seam, crew);
			return 0;
		}
		if (override?.leaveOpen !== undefined) {
			this.#leaveOpen(seam, holes, crew, override.leaveOpen, 'planned');
			return 0;
		}
		if (this.#shop.seldom('left open', 0.012)) {
			const few = holes.slice(0, random.between(1, 2));
			seam.next -= holes.length - few.length;
			this.#leaveOpen(seam, few, crew, random.pick(LEFT_OPEN), 'found');
			return 0;
		}
		this.#drive(seam, holes, crew, override);
		return holes.length;
	}

	/** The next holes of the row that one run takes: one to ten, all planned alike. */
	#take(seam: Seam): [Hole[], SeamOverride | undefined] {
		const { random } = this.#shop.pen;
		const first = seam.holes[seam.next];
		if (!first) return [[], undefined];
		const override = overrideAt(seam, first);
		const most =
			override?.leaveOpen !== undefined
				? seam.holes.length
				: random.chance(0.5)
					? 5
					: random.between(1, 10);
		const holes: Hole[] = [];
		for (let hole = seam.holes[seam.next]; hole && holes.length < most;) {
			if (overrideAt(seam, hole) !== override || hole.by !== first.by) break;
			holes.push(hole);
			hole = seam.holes[++seam.next];
		}
		return [holes, override];
	}

	// ---- a seam begins and ends ---------------------------------------------------------------------------

	#begin(seam: Seam, crew: Crew): void {
		const { pen } = this.#shop;
		const { random } = pen;
		seam.started = true;
		const { holes, stack } = seam.plan.body;
		seam.holes = Array.from({ length: holes.count }, (_, i) => ({ index: i + 1, heads: [] }));
		if (this.#shop.seldom('changed', 0.25)) this.#changePlan(seam, crew);
		if (random.chance(0.06)) {
			const at = random.between(1, holes.count - 1);
			const [gone] = seam.holes.splice(at, 1);
			if (gone)
				pen.hold(crew.device, 'holes.retired', seam.id, [gone], {
					reason: 'Shared with the clip, a bolt goes in'
				});
		}
		const dimpled = stack?.some(({ prep }) => prep === 'dimple');
		for (const step of ['deburred', dimpled ? 'dimpled' : 'cleaned', 'primed'] as const) {
			if (!random.chance(0.7)) continue;
			pen.wait(120, 600);
			pen.write(
				crew.device,
				'prep.done',
				{ step, ...(step === 'primed' && { primer: 'two-part epoxy', batch: this.#lot('P') }) },
				{ seam: seam.id }
			);
		}
	}

	#changePlan(seam: Seam, crew: Crew): void {
		const shop = this.#shop;
		const { pen } = shop;
		const { random } = pen;
		const { id } = seam;
		const on = seam.plan.body.note === undefined ? [] : [id];
		const known = pen.apart([]);
		const note = random.pick(CHANGES);
		const one = pen.write(crew.device, 'seam.changed', { note, revision: 'B' }, { seam: id, on });
		const other = this.#otherDevice(crew);
		if (!other || !shop.seldom('plan', 0.15)) return;
		const differs = { note: `${note}; ask about the end holes first` };
		const two = pen.write(other, 'seam.changed', differs, { seam: id, on, apart: known });
		shop.laterAt(seam, random.between(1, 4), () => {
			pen.write(shop.owner, 'seam.changed', differs, { seam: id, on: [one, two] });
		});
	}

	#finish(seam: Seam, crew: Crew): void {
		const shop = this.#shop;
		const { pen } = shop;
		if (seam.holes.at(-1)?.by === undefined && this.#shop.seldom('added', 0.03)) {
			const count = pen.random.between(1, 3);
			const by = pen.write(
				crew.device,
				'holes.added',
				{ count, first: seam.plan.body.holes.count + 1, reason: 'Drawing revision B' },
				{ seam: seam.id }
			);
			seam.holes.push(
				...Array.from({ length: count }, (_, i): Hole => ({ by, index: i + 1, heads: [] }))
			);
			return;
		}
		shop.queue.splice(shop.queue.indexOf(seam), 1);
		const { assembly } = seam;
		if (assembly.complete && assembly.seams.every(({ id }) => shop.queue.every((s) => s.id !== id)))
			shop.finished.add(assembly);
		if (pen.random.chance(0.5)) {
			this.#lookAt(seam, crew);
			ask(shop, seam);
		}
	}

	// ---- runs ---------------------------------------------------------------------------------------------

	#leaveOpen(
		seam: Seam,
		holes: readonly Hole[],
		crew: Crew,
		reason: string,
		why: 'planned' | 'found'
	): void {
		const shop = this.#shop;
		const { pen } = shop;
		pen.wait(20, 60);
		pen.hold(crew.device, 'holes.left_open', seam.id, holes, {
			reason,
			...(why === 'found' && { closedBy: 'A later evening' })
		});
		if (why === 'planned' && !/aligned/.test(reason)) return;
		shop.laterAt(seam, pen.random.between(2, 9), () => {
			if (holes.some(({ heads }) => heads.length !== 1)) return;
			pen.wait(60, 200);
			pen.hold(crew.device, 'holes.driven', seam.id, holes, this.#asUsed(seam, crew, undefined));
		});
	}

	#drive(seam: Seam, holes: readonly Hole[], crew: Crew, override: SeamOverride | undefined): void {
		const { pen } = this.#shop;
		const { random } = pen;
		const used = this.#asUsed(seam, crew, override);
		pen.wait(holes.length * 30, holes.length * 70);

		if (!this.#shop.isLate && this.#shop.seldom('forgotten', 0.012)) {
			this.#forget(seam, holes, crew, used);
			return;
		}
		if (random.chance(0.02)) this.#slip(seam, holes, crew, used);
		const other = this.#otherDevice(crew);
		const known = pen.apart(holes);
		pen.hold(crew.device, 'holes.driven', seam.id, holes, used);
		if (other && this.#shop.seldom('double', 0.008))
			this.#logTwice(seam, holes, used, other, known);
		else if (other && this.#shop.seldom('contested', 0.002))
			this.#contest(seam, holes, crew, other, known);
		else {
			seam.unseen.push(...holes);
			this.#check(seam, holes, crew);
		}
		pen.wait(60, 240);
	}

	/** Eyes on all, a gauge on one in ten. */
	#check(seam: Seam, holes: readonly Hole[], crew: Crew): void {
		const shop = this.#shop;
		const { random } = shop.pen;
		const one = holes[random.between(0, holes.length - 1)];
		if (!one) return;
		if (random.chance(holes.length / 10)) {
			const wrong = random.chance(0.05)
				? random.pick(['under_driven', 'over_driven'] as const)
				: undefined;
			read(shop, crew.device, seam, one, crew.bucker ?? crew.shooter, wrong);
			if (wrong) noteDefect(shop, crew, seam, [one], wrong);
		} else if (shop.isLate && shop.seldom('cracked', 0))
			noteDefect(shop, crew, seam, [one], 'cracked');
		else if (random.chance(0.06)) noteDefect(shop, crew, seam, [one]);
	}

	/** A thumb on the wrong key: struck at once, with the reason. */
	#slip(seam: Seam, holes: readonly Hole[], crew: Crew, used: Omit<Driven, 'holes'>): void {
		const { pen } = this.#shop;
		const before = holes.map(({ heads }) => heads);
		const wrong = pen.hold(crew.device, 'holes.driven', seam.id, holes, used);
		pen.wait(3, 20);
		pen.write(
			crew.device,
			'entry.struck',
			{ entry: wrong, reason: pen.random.pick(['undo', 'undo', 'wrong_holes', 'not_done']) },
			{ seam: seam.id }
		);
		holes.forEach((hole, i) => {
			hole.heads = before[i] ?? [];
		});
	}

	/** Driven tonight, written down another evening. */
	#forget(seam: Seam, holes: readonly Hole[], crew: Crew, used: Omit<Driven, 'holes'>): void {
		const shop = this.#shop;
		const at = shop.pen.wallTime();
		shop.laterAt(seam, shop.pen.random.between(1, 3), () => {
			shop.pen.wait(20, 60);
			const when = shop.seldom('about', 0.2)
				? ({ is: 'about', date: at.slice(0, 10) } as const)
				: ({ is: 'exact', at } as const);
			shop.pen.hold(crew.device, 'holes.driven', seam.id, holes, used, { when });
		});
	}

	/** The other phone was in the other pocket, and wrote the same holes down. */
	#logTwice(
		seam: Seam,
		holes: readonly Hole[],
		used: Omit<Driven, 'holes'>,
		other: Crew['device'],
		known: Apart
	): void {
		const shop = this.#shop;
		const { pen } = shop;
		const kept = holes[0]?.heads[0] ?? '';
		const double = pen.hold(other, 'holes.driven', seam.id, holes, used, { apart: known });
		shop.laterAt(seam, pen.random.between(1, 5), () => {
			pen.write(
				other,
				'entry.struck',
				{ entry: double, reason: 'logged_twice', keeps: kept },
				{ seam: seam.id }
			);
			for (const hole of holes) hole.heads = hole.heads.filter((id) => id !== double);
		});
	}

	/** One says driven, the other says left open, and neither knew. */
	#contest(
		seam: Seam,
		holes: readonly Hole[],
		crew: Crew,
		other: Crew['device'],
		known: Apart
	): void {
		const shop = this.#shop;
		const { pen } = shop;
		const one = holes.slice(-1);
		pen.hold(
			other,
			'holes.left_open',
			seam.id,
			one,
			{ reason: pen.random.pick(LEFT_OPEN) },
			{ apart: known }
		);
		shop.laterAt(seam, pen.random.between(1, 6), () => {
			pen.hold(crew.device, 'holes.driven', seam.id, one, {
				...this.#asUsed(seam, crew, undefined),
				note: 'Looked together: there is a rivet in it.'
			});
		});
	}

	#lookAt(seam: Seam, crew: Crew): void {
		const { pen } = this.#shop;
		const holes = seam.unseen.splice(0).filter(({ heads }) => heads.length === 1);
		if (holes.length === 0 || crew.bucker === undefined) return;
		pen.wait(30, 120);
		pen.remark(crew.device, 'holes.looked_at', seam.id, holes, { by: crew.bucker, all: true });
	}

	// ---- what is at hand ----------------------------------------------------------------------------------

	/** Setup, bag and sealant for a run, made ready where they are not. */
	#asUsed(seam: Seam, crew: Crew, override: SeamOverride | undefined): Omit<Driven, 'holes'> {
		const { body } = seam.plan;
		const method = override?.method ?? body.method ?? 'driven';
		const credit = {
			shooter: crew.shooter,
			...(crew.bucker !== undefined && method !== 'squeezed' && { bucker: crew.bucker })
		};
		// The plan names the solid rivet; the blind one is by the drawing.
		if (method === 'pulled') return { method, ...credit };
		const callout = override?.callout ?? body.callout;
		return {
			method,
			callout,
			setup: this.#setup(seam, crew, callout, method),
			bag: this.#bag(crew, callout),
			...(body.sealing === 'wet' && { sealant: this.#mix(crew) }),
			...credit
		};
	}

	#setup(
		seam: Seam,
		crew: Crew,
		callout: string,
		method: 'driven' | 'squeezed' | 'back_riveted' | 'screw' | 'bolt'
	): string {
		const { sealing, stack } = seam.plan.body;
		const key = [callout, method, sealing, crew.shooter, crew.bucker].join();
		if (this.#atHand?.key === key) return this.#atHand.setup;
		const { pen } = this.#shop;
		const { random } = pen;
		const { gun, psi } = TOOLS[thirtySeconds(callout)] ?? { gun: '3X', psi: '40' };
		const bar = random.pick(BARS);
		pen.wait(60, 240);
		const people = {
			shooter: crew.shooter,
			...(crew.bucker !== undefined && { bucker: crew.bucker })
		};
		const setup = pen.write(crew.device, 'setup.made', {
			method,
			callout,
			sealing: sealing ?? 'dry',
			...(method === 'squeezed'
				? { gun: 'hand squeezer', set: 'flat' }
				: {
						gun,
						pressure: { text: psi, unit: 'psi' },
						set: callout.startsWith('MS20470') ? 'cup' : 'swivel mushroom',
						bar: bar.name,
						barWeight: { text: bar.lb, unit: 'lb' }
					}),
			...people
		});
		this.#atHand = { key, setup };
		if (random.chance(0.8)) {
			pen.wait(60, 200);
			pen.write(crew.device, 'strip.shot', {
				callout,
				...(stack && { stack }),
				setup,
				...people,
				limits: limitsFor(callout),
				heads: Array.from({ length: 3 }, () => ({ found: found(this.#shop, callout) }))
			});
		}
		return setup;
	}

	#bag(crew: Crew, callout: string): string {
		const { pen } = this.#shop;
		let bag = this.#bags.get(callout);
		if (!bag || bag.left <= 0) {
			const id = pen.write(crew.device, 'bag.opened', {
				callout,
				lot: this.#lot('L'),
				markSeen: true
			});
			bag = { id, left: pen.random.between(300, 1200) };
			this.#bags.set(callout, bag);
		}
		bag.left -= 5;
		return bag.id;
	}

	#mix(crew: Crew): string {
		const { pen } = this.#shop;
		this.#sealant ??= pen.write(crew.device, 'sealant.mixed', {
			product: 'polysulfide, two parts, class B',
			batch: this.#lot('S'),
			mixedAt: pen.wallTime(),
			minutes: 120
		});
		return this.#sealant;
	}

	#lot(letter: string): string {
		return `${letter}-${String(++this.#lots).padStart(4, '0')}`;
	}

	// ---- the rest of the evening --------------------------------------------------------------------------

	#goHome(crew: Crew, day: number, began: number): void {
		const shop = this.#shop;
		const { pen } = shop;
		const { random } = pen;
		const seam = shop.queue[0];
		if (random.chance(0.35))
			pen.write(
				crew.device,
				'note.written',
				{ text: random.pick(NOTES) },
				seam && random.chance(0.5) ? { seam: seam.id } : {}
			);
		const [follower] = shop.devicesIn('follower');
		if (follower && random.chance(0.12)) {
			const note = pen.write(follower, 'note.written', {
				text: random.pick(CHEERS),
				mentions: [shop.owner.person]
			});
			if (random.chance(0.5))
				pen.write(shop.owner, 'note.written', { text: 'Soon!', replyTo: note }, { on: [] });
		}
		if (random.chance(0.04))
			pen.write(shop.owner, 'stock.counted', {
				callout: seam?.plan.body.callout ?? 'MS20470AD4-4',
				is: random.pick(['counted', 'bought']),
				pieces: random.between(2, 40) * 50
			});
		pen.wait(30, 120);
		pen.write(crew.device, 'time.worked', {
			people: [...new Set([crew.shooter, ...(crew.bucker === undefined ? [] : [crew.bucker])])],
			day: pen.wallTime(pen.localTime(day, 720)).slice(0, 10),
			minutes: Math.round((pen.clock - began) / 60_000),
			from: pen.wallTime(began),
			to: pen.wallTime()
		});
	}

	/** A second device that can have been in the shop without hearing of this one. */
	#otherDevice(crew: Crew): Crew['device'] | undefined {
		const others = this.#shop
			.devicesIn('owner', 'builder')
			.filter(({ id }) => id !== crew.device.id);
		return others[this.#shop.pen.random.between(0, others.length - 1)];
	}
}
