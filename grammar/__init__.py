"""The SPICE language as Lark grammars; read as data, never imported."""
