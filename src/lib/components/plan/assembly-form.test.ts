import { describe, expect, it } from 'vitest';
import { changedAssembly, changedInputs, emptyAssembly, readAssembly } from './assembly-form';

const typed = { ...emptyAssembly(2), name: ' Left elevator ', drawing: 'YT-02' };

describe('the form of an assembly', () => {
	it('becomes the body of the line that plans it', () => {
		expect(readAssembly(typed)).toEqual({
			ok: true,
			body: { name: 'Left elevator', order: 2, drawing: 'YT-02' }
		});
	});

	it('asks for a name', () => {
		const read = readAssembly({ ...typed, name: ' ' });
		expect(!read.ok && read.errors.name).toBe('Give it a name, like “Left elevator”.');
	});

	it('changes only what was changed, and empties with null', () => {
		const after = { ...typed, drawing: '', note: 'jig first' };
		const read = readAssembly(after);
		const inputs = changedInputs(typed, after);
		expect(read.ok && changedAssembly(read.body, inputs)).toEqual({
			drawing: null,
			note: 'jig first'
		});
		expect(read.ok && changedAssembly(read.body, [])).toBeUndefined();
	});
});
