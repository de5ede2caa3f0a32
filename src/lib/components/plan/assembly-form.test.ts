import { describe, expect, it } from 'vitest';
import { foldBuild } from '$lib/logbook/fold/build';
import { ASSEMBLY, idOf, JO, Scribe } from '../../../../tests/support/scribe';
import {
	ASSEMBLY_FORM,
	changedAssembly,
	emptyAssembly,
	emptyStep,
	openedAssembly,
	readAssembly,
	typedAssembly
} from './assembly-form';
import { changedFields, follow, settlement } from './opened';

const typed = { ...emptyAssembly(2), name: ' Left elevator ', drawing: 'YT-02' };
const STEP = idOf(70);
const torque = {
	...emptyStep(STEP),
	text: 'torque the hinge bolts',
	value: 'number' as const,
	unit: 'in-lb'
};

describe('the form of an assembly', () => {
	it('becomes the body of the line that plans it', () => {
		expect(readAssembly({ ...typed, outline: 'elevator', steps: [torque] })).toEqual({
			ok: true,
			body: {
				name: 'Left elevator',
				order: 2,
				outline: 'elevator',
				drawing: 'YT-02',
				steps: { [STEP]: { text: 'torque the hinge bolts', value: 'number', unit: 'in-lb' } }
			}
		});
	});

	it('asks for a name, and for what is to be done in a step', () => {
		const read = readAssembly({ ...typed, name: ' ', steps: [emptyStep(STEP)] });
		const errors = read.ok ? {} : read.errors;
		expect(errors['name']).toBe('Give it a name, like “Left elevator”.');
		expect(errors['steps.0.text']).toMatch(/^Say what is to be done/);
	});

	it('keeps a unit only for a number', () => {
		const read = readAssembly({ ...typed, steps: [{ ...torque, value: '' }] });
		expect(read.ok && read.body.steps?.[STEP]).toEqual({ text: 'torque the hinge bolts' });
	});
});

describe('changing an assembly', () => {
	function planned() {
		const scribe = new Scribe();
		const read = readAssembly({ ...typed, steps: [torque] });
		if (!read.ok) throw new Error(JSON.stringify(read.errors));
		const line = scribe.write('assembly.planned', read.body, { id: ASSEMBLY, assembly: ASSEMBLY });
		const fold = () => {
			const [assembly] = foldBuild(scribe.lines).assemblies;
			if (!assembly) throw new Error('no assembly');
			return assembly;
		};
		return { scribe, line, fold };
	}

	it('shows what was planned, and unchanged it changes nothing', () => {
		const shown = typedAssembly(planned().fold());
		expect(shown).toEqual({ ...typed, name: 'Left elevator', steps: [torque] });
		expect(changedFields(ASSEMBLY_FORM, shown, { ...shown, name: ` ${shown.name}` })).toEqual([]);
	});

	it('carries only what was changed; each step is a field of its own, and null empties', () => {
		const before = typedAssembly(planned().fold());
		const added = { ...emptyStep(idOf(71)), text: 'close the inspection hole' };
		const after = { ...before, drawing: '', note: 'jig first', steps: [added] };
		const read = readAssembly(after);
		const fields = changedFields(ASSEMBLY_FORM, before, after);
		expect(read.ok && changedAssembly(read.body, fields)).toEqual({
			drawing: null,
			note: 'jig first',
			steps: { [STEP]: null, [idOf(71)]: { text: 'close the inspection hole' } }
		});
	});

	it('takes over what others change meanwhile, and two who changed one step are settled', () => {
		const { scribe, line, fold } = planned();
		const opened = openedAssembly(fold());
		const change = (text: string, author?: string) =>
			scribe.write(
				'assembly.changed',
				{ note: `by ${text}`, steps: { [STEP]: { text } } },
				{ assembly: ASSEMBLY, on: [line], ...(author !== undefined && { author }) }
			);
		const first = change('torque to the drawing');
		const mine = { ...opened.typed, steps: [{ ...torque, unit: 'Nm' }] };
		const followed = follow(ASSEMBLY_FORM, opened, mine, openedAssembly(fold()));
		expect(followed.both).toEqual([`steps.${STEP}`]);
		expect(followed.typed).toMatchObject({ note: 'by torque to the drawing' });
		expect(followed.typed.steps[0]?.unit).toBe('Nm');

		change('torque twice', JO);
		const field = `steps.${STEP}`;
		expect(fold().fields.get(field)?.differs).toBe(true);
		const { body, on } = settlement<'assembly.changed'>(fold().fields, field, first.id);
		scribe.write('assembly.changed', body, {
			assembly: ASSEMBLY,
			on: scribe.lines.filter(({ id }) => on.includes(id))
		});
		expect(fold().fields.get(field)?.differs).toBe(false);
		expect(fold().steps).toEqual([[STEP, { text: 'torque to the drawing' }]]);
	});
});
