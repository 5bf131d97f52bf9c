"""What a person looks at: tables, drawings, charts. Data in, things to show out."""
