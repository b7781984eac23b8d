import tseslint from 'typescript-eslint';

export default tseslint.config(
  { ignores: ['src/kernel/assembly/**', 'src/kernel/generated/**', 'dist/**', 'node_modules/**', 'out/**', 'coverage/**', '.eslint.config.js', '.vitest.config.ts', '.vitest.debian.config.ts'] },
  ...tseslint.configs.recommendedTypeChecked,
  {
    languageOptions: { parserOptions: { project: './tsconfig.json', tsconfigRootDir: import.meta.dirname } },
    rules: {
      // noUncheckedIndexedAccess makes every typed-array read "possibly undefined"; "!" is how a loop with known bounds says so.
      '@typescript-eslint/no-non-null-assertion': 'off',
      '@typescript-eslint/consistent-type-imports': 'error',
      '@typescript-eslint/no-unused-vars': ['error', { argsIgnorePattern: '^_', ignoreRestSiblings: true }],
      'eqeqeq': 'error',
      'no-console': 'error',
      'prefer-const': 'error',
    },
  },
);
