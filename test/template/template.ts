import { readFileSync } from 'node:fs';
import { parse, type ScalarTag } from 'yaml';

// biome-ignore lint/suspicious/noExplicitAny: a template is a tree of many shapes, and its tests say what they expect
export type Node = any;

/** CloudFormation's short forms, read as their long ones. Source: AWS CloudFormation User Guide, "Intrinsic function reference". */
const scalars = ['Ref', 'Sub', 'GetAtt', 'Condition'].map(
  (name): ScalarTag => ({
    tag: `!${name}`,
    resolve: (text) => ({
      [name === 'Ref' || name === 'Condition' ? name : `Fn::${name}`]:
        name === 'GetAtt' ? text.split('.') : text,
    }),
  }),
);
const lists = ['If', 'Equals', 'Not', 'Join', 'And', 'Or'].map((name) => ({
  tag: `!${name}`,
  collection: 'seq' as const,
  resolve: (seq: Node) => ({ [`Fn::${name}`]: seq.toJSON() }),
}));

export const templateText = readFileSync(new URL('../../template.yaml', import.meta.url), 'utf8');
export const template: Node = parse(templateText, { customTags: [...scalars, ...lists] });

export const resources: Record<string, { Type: string; Properties: Node; Condition?: string }> =
  template.Resources;

export function ofType(type: string): [name: string, properties: Node][] {
  return Object.entries(resources)
    .filter(([, resource]) => resource.Type === type)
    .map(([name, resource]) => [name, resource.Properties ?? {}]);
}

/** Every string in a tree, with the path that leads to it. */
export function* strings(node: Node, path = ''): Iterable<[path: string, text: string]> {
  if (typeof node === 'string') yield [path, node];
  else if (Array.isArray(node)) for (const [i, item] of node.entries()) yield* strings(item, `${path}/${i}`);
  else if (node !== null && typeof node === 'object')
    for (const [key, value] of Object.entries(node)) yield* strings(value, `${path}/${key}`);
}

export interface Statement {
  readonly actions: readonly string[];
  /** As written, `${Bucket.Arn}` and all. */
  readonly resources: readonly string[];
  readonly condition: Node;
}

const list = (value: Node): Node[] => (Array.isArray(value) ? value : [value]);
const written = (resource: Node): string =>
  typeof resource === 'string'
    ? resource
    : (resource['Fn::Sub'] ?? resource['Fn::GetAtt']?.join('.') ?? JSON.stringify(resource));

/** What a role's own policies allow. */
export function statementsOf(role: string): Statement[] {
  return resources[role].Properties.Policies.flatMap(({ PolicyDocument }: Node) =>
    PolicyDocument.Statement.map((statement: Node) => {
      if (statement.Effect !== 'Allow') throw new Error(`${role}: a statement that is not Allow`);
      return {
        actions: list(statement.Action),
        resources: list(statement.Resource).map(written),
        condition: statement.Condition ?? null,
      };
    }),
  );
}
