import { describe, expect, it } from 'vitest';
import { DeskError } from '../../src/desk/desk-problem.ts';
import { readDesk } from '../../src/desk/read-desk.ts';

const plain = {
  version: 1,
  name: 'Fenmark Water',
  queues: [{ id: 'billing', title: 'Billing' }],
  costs: { lookMinutes: 1, wrongRouteMinutes: 10 },
  forms: ['contact'],
};
const read = (intake: unknown) =>
  readDesk(new TextEncoder().encode(JSON.stringify({ ...plain, intake })), 'desk.json');
const pointersOf = (intake: unknown): string[] => {
  try {
    read(intake);
  } catch (error) {
    if (error instanceof DeskError)
      return error.problems.map(({ place }) => place.slice(place.indexOf('#') + 1));
    throw error;
  }
  return [];
};

describe('the intake of a desk', () => {
  it('is absent when the file has none', () => {
    expect(read(undefined).intake).toBeUndefined();
  });

  it('has defaults: text fields of 5,000 characters, suspects held, a helpdesk that speaks our members', () => {
    expect(read({ forms: [{ id: 'contact', fields: [{ name: 'message' }] }] }).intake).toEqual({
      origins: [],
      forms: [
        {
          id: 'contact',
          fields: [{ name: 'message', isRequired: false, charactersMax: 5000, values: null }],
          senderField: null,
          trapField: null,
          shownAtField: null,
          secondsMin: 3,
          onSuspect: 'hold',
          thanksUrl: null,
        },
      ],
      confirmations: { message: '/message', queue: '/queue', by: '/by', at: '/at', queueNames: {} },
    });
  });

  const field = { name: 'message' };
  it.each([
    ['an origin with a path', { origins: ['https://a.example/x'] }, '/intake/origins/0'],
    ['an origin of any page', { origins: ['*'] }, '/intake/origins/0'],
    [
      'a form that the desk does not declare',
      { forms: [{ id: 'other', fields: [field] }] },
      '/intake/forms/0/id',
    ],
    ['a form without fields', { forms: [{ id: 'contact', fields: [] }] }, '/intake/forms/0/fields'],
    [
      'a field twice',
      { forms: [{ id: 'contact', fields: [field, field] }] },
      '/intake/forms/0/fields/1/name',
    ],
    [
      'a sender field that is not there',
      { forms: [{ id: 'contact', fields: [field], senderField: 'email' }] },
      '/intake/forms/0/senderField',
    ],
    [
      'thanks over plain HTTP',
      { forms: [{ id: 'contact', fields: [field], thanksUrl: 'http://a.example' }] },
      '/intake/forms/0/thanksUrl',
    ],
    [
      'a pointer without a slash',
      { confirmations: { message: 'id', queue: '/q', by: '/b', at: '/a' } },
      '/intake/confirmations/message',
    ],
    [
      'a pointer with a lone tilde',
      { confirmations: { message: '/a~b', queue: '/q', by: '/b', at: '/a' } },
      '/intake/confirmations/message',
    ],
    [
      'a queue name for no queue',
      { confirmations: { message: '/m', queue: '/q', by: '/b', at: '/a', queueNames: { X: 'gardening' } } },
      '/intake/confirmations/queueNames/X',
    ],
    ['an unknown member', { colour: 1 }, '/intake/colour'],
  ])('refuses %s', (_name, intake, pointer) => {
    expect(pointersOf(intake)).toEqual([pointer]);
  });
});
