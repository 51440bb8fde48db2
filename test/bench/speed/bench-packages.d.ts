/** The packages ship no types; what is used of them. */
declare module 'bayes' {
  interface Classifier {
    learn(tokens: readonly string[], category: string): Promise<unknown>;
    categorize(tokens: readonly string[]): Promise<string>;
  }
  export default function bayes(options: { tokenizer: (tokens: never) => unknown }): Classifier;
}

declare module 'ml-naivebayes' {
  export class MultinomialNB {
    train(rows: readonly (readonly number[])[], labels: readonly number[]): void;
    predict(rows: readonly (readonly number[])[]): number[];
  }
}
