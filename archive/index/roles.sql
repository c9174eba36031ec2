-- Roles of an index that a laboratory shares in PostgreSQL: one that reads, one that also records.
--
-- Who runs this, once: the owner of the index, which is whom `stillroom init --index postgresql+psycopg://...` connected as, in
-- the same database and schema, with the right to make roles:
--
--   stillroom roles | psql "postgresql://owner@host/database"
--
-- Then give people one of the roles each, and let them connect as themselves:
--
--   GRANT stillroom_reader TO somebody;    searches and shows; cannot change a row
--   GRANT stillroom_writer TO somebody;    ingests and reduces; cannot drop, alter or empty a table
--
-- Only the owner raises the tables to a newer revision. Every row can be made again from the sealed files
-- (stillroom rebuild-index); what protects those is the permissions of their folder, so a reader of the index should also be
-- one who may only read that folder.
--
-- References: PostgreSQL manual, sections 5.8 "Privileges" and 22 "Database Roles", and the commands GRANT and
-- ALTER DEFAULT PRIVILEGES.

DO $$
DECLARE
    place text := current_schema();
    role text;
BEGIN
    FOREACH role IN ARRAY ARRAY['stillroom_reader', 'stillroom_writer'] LOOP
        IF NOT EXISTS (SELECT FROM pg_roles WHERE rolname = role) THEN
            EXECUTE format('CREATE ROLE %I NOLOGIN NOSUPERUSER NOCREATEDB NOCREATEROLE', role);
        END IF;
        EXECUTE format('GRANT USAGE ON SCHEMA %I TO %I', place, role);
        EXECUTE format('REVOKE CREATE ON SCHEMA %I FROM %I', place, role);
        EXECUTE format('REVOKE ALL ON ALL TABLES IN SCHEMA %I FROM %I', place, role);
        EXECUTE format('GRANT SELECT ON ALL TABLES IN SCHEMA %I TO %I', place, role);
        EXECUTE format('ALTER DEFAULT PRIVILEGES IN SCHEMA %I GRANT SELECT ON TABLES TO %I', place, role);
    END LOOP;
    -- Before version 15, everybody could make tables in the schema "public".
    EXECUTE format('REVOKE CREATE ON SCHEMA %I FROM PUBLIC', place);
    EXECUTE format('GRANT INSERT, UPDATE, DELETE ON ALL TABLES IN SCHEMA %I TO stillroom_writer', place);
    EXECUTE format('GRANT USAGE ON ALL SEQUENCES IN SCHEMA %I TO stillroom_writer', place);
    EXECUTE format(
        'ALTER DEFAULT PRIVILEGES IN SCHEMA %I GRANT INSERT, UPDATE, DELETE ON TABLES TO stillroom_writer', place);
    EXECUTE format(
        'ALTER DEFAULT PRIVILEGES IN SCHEMA %I GRANT USAGE ON SEQUENCES TO stillroom_writer', place);
    -- Which revision the tables have is the owner's to say.
    EXECUTE format('REVOKE INSERT, UPDATE, DELETE ON %I.alembic_version FROM stillroom_writer', place);
END
$$;
